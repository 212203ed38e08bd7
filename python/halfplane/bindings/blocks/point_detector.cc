// SPDX-License-Identifier: GPL-3.0-or-later
// point_detector for Python.
#include "bind.h"

#include <gnuradio/halfplane/point_detector.h>

namespace py = pybind11;
using gr::halfplane::point_detector;

void bind_point_detector(py::module& m)
{
    const auto free = py::call_guard<py::gil_scoped_release>();
    py::class_<point_detector,
               gr::sync_interpolator,
               gr::sync_block,
               gr::block,
               gr::basic_block,
               point_detector::sptr>(
        m,
        "point_detector",
        R"doc(Exact decisions on complex samples: the nearest point, or the most probable one where n0 is given.

set: the constellation, at the scale of the samples. output: 'indices' (short), 'byte_indices' (bytes,
sets of up to 255 points), 'labels' (short, the label as a
number) or 'bits' (bytes, label_bits a sample, leftmost bit first). n0: noise density for MAP decisions, in the
square of the points' unit; 0 decides for the nearest point. NaN and infinite samples give -1, or 255 where bytes come out. Raises ValueError naming parameter and value.)doc")
        .def(py::init(&point_detector::make),
             py::arg("set"),
             py::arg("output") = "indices",
             py::arg("n0") = 0.0)
        .def("set_n0",
             &point_detector::set_n0,
             py::arg("n0"),
             free,
             "New N0; 0 decides for the nearest point.")
        .def("n0", &point_detector::n0, "N0 in use; 0 where the nearest point is decided for.")
        .def("set_signal_set",
             &point_detector::set_signal_set,
             py::arg("set"),
             free,
             "Another set, while the flowgraph runs; with 'bits' it must have as many label bits.");
}
