// SPDX-License-Identifier: GPL-3.0-or-later
// report_pmt for Python: JSON text on one side, PMT on the other.
#include "bind.h"

#include <gnuradio/halfplane/report_pmt.h>

#include <stdexcept>
#include <string>

namespace py = pybind11;

void bind_report_pmt(py::module& m)
{
    m.def(
        "json_to_pmt",
        [](const std::string& text) {
            try {
                return gr::halfplane::json_to_pmt(nlohmann::ordered_json::parse(text));
            } catch (const nlohmann::json::exception& error) {
                throw std::invalid_argument(std::string("json_to_pmt: ") + error.what());
            }
        },
        py::arg("text"),
        R"doc(A JSON document (text) as a PMT: objects become dicts, arrays vectors, integers uint64, `time` the
tuple (seconds, fraction) that rx_time tags use. Raises ValueError on null or text that is no JSON.)doc");
    m.def(
        "pmt_to_json",
        [](const pmt::pmt_t& message) { return gr::halfplane::pmt_to_json(message).dump(); },
        py::arg("message"),
        "The way back: a report from a message port as one line of JSON. Raises ValueError on what no report "
        "holds.");
}
