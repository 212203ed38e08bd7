// SPDX-License-Identifier: GPL-3.0-or-later
// aligner for Python.
#include "bind.h"

#include <gnuradio/halfplane/aligner.h>

namespace py = pybind11;
using gr::halfplane::aligner;

void bind_aligner(py::module& m)
{
    py::class_<aligner, gr::block, gr::basic_block, aligner::sptr>(
        m,
        "aligner",
        R"doc(Finds the pattern in the received symbols and puts the reference beside them.

In: one complex sample a symbol, any gain and phase. Out 0: the samples, corrected from the past alone. Out 1
(short): the index that was sent, or -1 before lock, -2 slip, -3 signal lost, -4 overflow. Sample k comes out as
sample k once aligner.holdback() later ones are in, so that gaps are judged afterwards; where the input ends by itself, the rest comes out too.

set, pattern: as for test_pattern. correction: 'running', 'held' (frozen after lock) or 'off' (only the set's own
rotation or mirror is undone). memory: symbols over which 'running' averages, >= 16. symbol_rate: Hz, to judge
rx_time tags; 0 where unknown.

Tags on both outputs: 'lock', 'pending'. Message ports: 'lock' out, 'overflow' in. Raises ValueError naming
parameter and value.)doc")
        .def(py::init(&aligner::make),
             py::arg("set"),
             py::arg("pattern"),
             py::arg("correction") = "running",
             py::arg("memory") = std::uint64_t{2000},
             py::arg("symbol_rate") = 0.0)
        .def_static("holdback",
                    &aligner::holdback,
                    "Symbols held back: output = max(0, input - holdback) until the input ends.")
        .def("state", &aligner::state, "'searching', 'held', 'doubtful' or 'lost'.")
        .def("slips", &aligner::slips, "Slips seen so far.");
}
