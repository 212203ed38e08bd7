// SPDX-License-Identifier: GPL-3.0-or-later
// topics: one function for each group of bindings, and the shapes that all of them share.
#pragma once

#include "parallel.h"

#include <pybind11/numpy.h>
#include <pybind11/pybind11.h>

#include <complex>
#include <cstddef>
#include <string>
#include <vector>

namespace halfplane::python {

namespace py = pybind11;

using doubles = py::array_t<double, py::array::c_style | py::array::forcecast>;
using complexes = py::array_t<std::complex<double>, py::array::c_style | py::array::forcecast>;

void bind_sets(py::module_& m);
void bind_set_files(py::module_& m);
void bind_laws(py::module_& m);
void bind_rates(py::module_& m);
void bind_geometry(py::module_& m);
void bind_measures(py::module_& m);
void bind_simulate(py::module_& m);
void bind_planning(py::module_& m);
void bind_recordings(py::module_& m);

/// A copy of a vector as a one-dimensional array.
template <typename T>
py::array_t<T> array_of(const std::vector<T>& values)
{
    return py::array_t<T>(static_cast<py::ssize_t>(values.size()), values.data());
}

/// Shape of an array, with further dimensions behind it.
inline std::vector<py::ssize_t> shape_of(const py::array& a, std::vector<py::ssize_t> more = {})
{
    std::vector<py::ssize_t> shape(a.shape(), a.shape() + a.ndim());
    shape.insert(shape.end(), more.begin(), more.end());
    return shape;
}

/// A number where the array has no dimensions, else the array itself.
template <typename T>
py::object number_or_array(py::array_t<T> a)
{
    if (a.ndim() == 0)
        return py::cast(*a.data());
    return std::move(a);
}

/// f of every element, in the shape that came in, on all cores; the interpreter is free for others meanwhile.
template <typename F>
py::object over(const doubles& x, F f)
{
    py::array_t<double> result(shape_of(x));
    const double* in = x.data();
    double* out = result.mutable_data();
    const auto count = static_cast<std::size_t>(x.size());
    {
        py::gil_scoped_release free;
        parallel_for(count, [&](std::size_t k) { out[k] = f(in[k]); });
    }
    return number_or_array(std::move(result));
}

} // namespace halfplane::python
