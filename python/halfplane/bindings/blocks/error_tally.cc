// SPDX-License-Identifier: GPL-3.0-or-later
// error_tally for Python.
#include "bind.h"

#include <gnuradio/halfplane/error_tally.h>

namespace py = pybind11;
using gr::halfplane::error_tally;

void bind_error_tally(py::module& m)
{
    py::class_<error_tally, gr::block, gr::basic_block, error_tally::sptr>(
        m,
        "error_tally",
        R"doc(Errors behind any decoder: two streams of bits that should be equal.

In 0 (byte): what was sent. In 1 (byte): what the decoder made of it, `delay` bytes later.

packed: eight bits a byte, the most significant first, else one. frame_bits: 0 for no frames. target: of the
verdict, 'ber:1e-5' or 'fer:1e-2', '' for none. window: bits a report, >= 1. confidence: inside (0, 1).
max_excluded: share left out beyond which nothing passes.

Message port 'report' out (dict). Raises ValueError naming parameter and value.)doc")
        .def(py::init(&error_tally::make),
             py::arg("packed") = false,
             py::arg("frame_bits") = std::uint64_t{0},
             py::arg("target") = "",
             py::arg("delay") = std::uint64_t{0},
             py::arg("window") = std::uint64_t{1000000},
             py::arg("confidence") = 0.95,
             py::arg("max_excluded") = 1e-3)
        .def("report",
             &error_tally::report,
             py::call_guard<py::gil_scoped_release>(),
             "The latest report as JSON text, '' before the first; the final one after top_block.wait().");
}
