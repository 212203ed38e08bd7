// SPDX-License-Identifier: GPL-3.0-or-later
// noise_at for Python: Es as a number or a set, the pulse as its energy or its taps.
#include "bind.h"

#include <gnuradio/halfplane/noise_at.h>

#include <pybind11/stl.h>

#include <variant>

namespace py = pybind11;
using gr::halfplane::noise_at;

namespace {

using energy_or_set = std::variant<double, const ::halfplane::signal_set*>;
using energy_or_taps = std::variant<double, std::vector<float>>;

noise_at::sptr make(const energy_or_set& es, double es_n0_db, const energy_or_taps& pulse, std::uint64_t seed)
{
    const double energy = std::holds_alternative<double>(pulse)
                              ? std::get<double>(pulse)
                              : noise_at::energy(std::get<std::vector<float>>(pulse));
    if (std::holds_alternative<double>(es))
        return noise_at::make(std::get<double>(es), es_n0_db, energy, seed);
    return noise_at::make(*std::get<const ::halfplane::signal_set*>(es), es_n0_db, energy, seed);
}

} // namespace

void bind_noise_at(py::module& m)
{
    const auto free = py::call_guard<py::gil_scoped_release>();
    py::class_<noise_at, gr::sync_block, gr::block, gr::basic_block, noise_at::sptr>(
        m,
        "noise_at",
        R"doc(Adds white noise so that the matched filter's output stands at a declared Es/N0.

es: a signal_set, or the mean energy of a symbol. es_n0_db: -200 ... 200 dB. pulse: the taps of the transmit pulse,
or their energy (sum of squares); 1 without pulse shaping. A gain between mapper and this block goes into the
energy (as gain squared), a gain after it needs nothing. seed: the same seed gives the same noise.

Message port 'input': {es_n0_db, es_n0_db_se, source: 'declared'} before the first sample and at each change.
Raises ValueError naming parameter and value.)doc")
        .def(py::init(&make),
             py::arg("es"),
             py::arg("es_n0_db"),
             py::arg("pulse") = energy_or_taps(1.0),
             py::arg("seed") = std::uint64_t{1})
        .def("set_es_n0_db",
             &noise_at::set_es_n0_db,
             py::arg("es_n0_db"),
             free,
             "New Es/N0, while the flowgraph runs.")
        .def("es_n0_db", &noise_at::es_n0_db, "Es/N0 declared, in dB.")
        .def("n0", &noise_at::n0, "The variance added to each sample.")
        .def_static(
            "energy", &noise_at::energy, py::arg("taps"), "Energy of pulse taps, the sum of their squares.");
}
