// SPDX-License-Identifier: GPL-3.0-or-later
// llr_detector for Python.
#include "bind.h"

#include <gnuradio/halfplane/llr_detector.h>

namespace py = pybind11;
using gr::halfplane::llr_detector;

void bind_llr_detector(py::module& m)
{
    const auto free = py::call_guard<py::gil_scoped_release>();
    py::class_<llr_detector,
               gr::sync_interpolator,
               gr::sync_block,
               gr::block,
               gr::basic_block,
               llr_detector::sptr>(
        m,
        "llr_detector",
        R"doc(Log-likelihood ratios of the label bits, for any set, labels and priors.

Complex samples in; floats out, label_bits a sample, leftmost bit first, in nats. A positive ratio speaks for bit 0;
positive=1 flips every sign, so that it speaks for bit 1. set: the constellation, at the scale of the samples. n0:
noise density > 0, in the square of the points' unit. rule: 'exact' (all points, priors included) or 'max-log' (the
likeliest point of each bit value). saturation: ratios are clipped to plus or minus this, at most 1e6. The ratios of a
NaN or infinite sample are 0. Raises ValueError naming parameter and value.)doc")
        .def(py::init(&llr_detector::make),
             py::arg("set"),
             py::arg("n0"),
             py::arg("rule") = "exact",
             py::arg("positive") = 0,
             py::arg("saturation") = 1e6f)
        .def("set_n0", &llr_detector::set_n0, py::arg("n0"), free, "New N0, > 0.")
        .def("n0", &llr_detector::n0, free, "N0 in use.")
        .def("set_signal_set",
             &llr_detector::set_signal_set,
             py::arg("set"),
             free,
             "Another set with as many label bits, while the flowgraph runs.");
}
