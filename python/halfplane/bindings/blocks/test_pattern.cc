// SPDX-License-Identifier: GPL-3.0-or-later
// test_pattern for Python.
#include "bind.h"

#include <gnuradio/halfplane/test_pattern.h>

namespace py = pybind11;
using gr::halfplane::test_pattern;

void bind_test_pattern(py::module& m)
{
    py::class_<test_pattern, gr::sync_block, gr::block, gr::basic_block, test_pattern::sptr>(
        m,
        "test_pattern",
        R"doc(The known symbols of a link: an endless source of point indices (short).

set: the constellation that carries them. pattern: 'o150:N' (ITU-T O.150, N = 9, 11, 15, 20, 23, 29, 31; a point
for every label is needed), 'draw:SEED[:PERIOD]' (indices by prior), 'file:PATH' (text: bits, or indices with
spaces). Raises ValueError naming what is not understood, or why the set cannot carry it.)doc")
        .def(py::init(&test_pattern::make), py::arg("set"), py::arg("pattern"))
        .def("period", &test_pattern::period, "Symbols after which the pattern repeats.");
}
