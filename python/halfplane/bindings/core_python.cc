// SPDX-License-Identifier: GPL-3.0-or-later
// core_python: the core for Python, on numpy arrays; needs no GNU Radio.
#include "halfplane/signal_set.h"

#include <pybind11/complex.h>
#include <pybind11/pybind11.h>
#include <pybind11/stl.h>

namespace py = pybind11;
using namespace halfplane;

PYBIND11_MODULE(core_python, m)
{
    py::register_exception<invalid_set>(m, "invalid_set", PyExc_ValueError);

    py::class_<signal_set, std::shared_ptr<signal_set>>(
        m, "signal_set", "Points, labels and priors of a constellation.")
        .def(py::init<std::vector<complex>,
                      std::vector<label_t>,
                      unsigned,
                      std::vector<double>,
                      std::string,
                      std::string>(),
             py::arg("points"),
             py::arg("labels"),
             py::arg("label_bits"),
             py::arg("priors") = std::vector<double>{},
             py::arg("name") = "",
             py::arg("note") = "")
        .def_static(
            "with_natural_labels", &signal_set::with_natural_labels, py::arg("points"), py::arg("name") = "")
        .def_property_readonly("size", &signal_set::size)
        .def_property_readonly("points", &signal_set::points)
        .def_property_readonly("es", &signal_set::es);
}
