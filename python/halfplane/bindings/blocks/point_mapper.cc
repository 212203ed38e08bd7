// SPDX-License-Identifier: GPL-3.0-or-later
// point_mapper for Python.
#include "bind.h"

#include <gnuradio/halfplane/point_mapper.h>

namespace py = pybind11;
using gr::halfplane::point_mapper;

void bind_point_mapper(py::module& m)
{
    py::class_<point_mapper,
               gr::sync_decimator,
               gr::sync_block,
               gr::block,
               gr::basic_block,
               point_mapper::sptr>(
        m,
        "point_mapper",
        R"doc(Indices, labels or bits to the complex points of a set, one sample a symbol.

set: the constellation. input: 'indices' (short, 0 ... M-1), 'byte_indices' (bytes, sets of up to 255 points), 'labels' (short, the label as a number) or
'bits' (bytes, one bit a byte, leftmost bit of the label first). Points are sent as the set gives them. A symbol
that the set does not have ends the stream with an error in the log. Raises ValueError for any other input.)doc")
        .def(py::init(&point_mapper::make), py::arg("set"), py::arg("input") = "indices");
}
