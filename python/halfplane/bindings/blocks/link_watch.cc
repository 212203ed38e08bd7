// SPDX-License-Identifier: GPL-3.0-or-later
// link_watch for Python.
#include "bind.h"

#include <gnuradio/halfplane/link_watch.h>

namespace py = pybind11;
using gr::halfplane::link_watch;

void bind_link_watch(py::module& m)
{
    py::class_<link_watch, gr::sync_block, gr::block, gr::basic_block, link_watch::sptr>(
        m,
        "link_watch",
        R"doc(Counts errors, gauges the points, and sets the predicted rates beside the count.

In 0: complex samples, one a symbol. In 1 (short): the index sent, or a negative code, from aligner. In 2 (short,
only with decisions='receiver'): the receiver's decisions, -1 where it has none.

set: the constellation. pattern: its text, for the report. window: symbols a report, >= 1. confidence: of the
intervals, inside (0, 1). symbol_rate: Hz, 0 where unknown. decisions: 'own' or 'receiver'.

target: what the verdict is about, 'ser:1e-3', 'ber:1e-5' or 'fer:1e-2', '' for none. frame_symbols: symbols of a
frame, 0 for none. max_excluded: share left out beyond which nothing passes. resume: path of the log of an earlier run that
goes on here, with the same settings. explain: False
leaves losses and premises out.

Message ports: 'report' out (dict), 'input' in (from noise_at or a meter). Raises ValueError naming parameter and
value.)doc")
        .def(py::init(&link_watch::make),
             py::arg("set"),
             py::arg("pattern"),
             py::arg("window") = std::uint64_t{10000},
             py::arg("confidence") = 0.95,
             py::arg("symbol_rate") = 0.0,
             py::arg("decisions") = "own",
             py::arg("target") = "",
             py::arg("frame_symbols") = std::uint64_t{0},
             py::arg("max_excluded") = 1e-3,
             py::arg("resume") = "",
             py::arg("explain") = true)
        .def("report",
             &link_watch::report,
             py::call_guard<py::gil_scoped_release>(),
             "The latest report as JSON text, '' before the first; the final one after top_block.wait().");
}
