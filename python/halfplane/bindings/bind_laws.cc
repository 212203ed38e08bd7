// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of channel laws, ready ones and a user's own, and of noise that is not circular.
#include "topics.h"

#include "halfplane/law.h"
#include "halfplane/noise_shape.h"

#include <pybind11/stl.h>

#include <stdexcept>

namespace halfplane::python {
namespace {

metric parse_metric(const std::string& text)
{
    if (text != "matched" && text != "nearest")
        throw std::invalid_argument("decision is '" + text + "'; one of matched, nearest is wanted");
    return text == "matched" ? metric::matched : metric::nearest;
}

} // namespace

void bind_laws(py::module_& m)
{
    py::class_<law, std::shared_ptr<law>>(
        m, "law", R"(The law of the random power gain G of a channel, mean Es/N0 as stated.

Made by law_of() from what the command line takes, or by mixture().)")
        .def_property_readonly("name", &law::name, "As the command line writes it.")
        .def(
            "tail",
            [](const law& l, const doubles& u) { return over(u, [&](double x) { return l.tail(x); }); },
            py::arg("u"),
            "T(u) = E[exp(-G·u)] at u >= 0, u = r²/N0; in the shape of u.")
        .def(
            "ln_tail",
            [](const law& l, const doubles& u) { return over(u, [&](double x) { return l.ln_tail(x); }); },
            py::arg("u"),
            "ln T(u), also where T(u) is below the smallest double.")
        .def("__repr__", [](const law& l) { return "<law " + l.name() + ">"; });
    m.def(
        "law_of",
        [](const std::string& text) { return std::const_pointer_cast<law>(parse_law(text)); },
        py::arg("text"),
        "The law that the command line writes so: awgn, rayleigh, rician:K_DB, nakagami:M, LAW*L, "
        "impulsive:A:GAMMA.\n"
        "Raises ValueError naming what is not understood.");
    m.def(
        "mixture",
        [](const std::vector<std::pair<double, double>>& states,
           const std::string& name) -> std::shared_ptr<law> {
            std::vector<channel_state> all;
            for (const auto& [probability, gain] : states)
                all.push_back({probability, gain});
            return std::make_shared<mixture>(std::move(all), name);
        },
        py::arg("states"),
        py::arg("name") = "mixture",
        "A law of your own: [(probability, power gain)], the gain relative to the stated Es/N0, known to the "
        "detector.\n"
        "Raises ValueError unless probabilities are above 0 and sum to 1 within 1e-9, and gains are above "
        "0.");
    py::class_<noise_shape>(
        m,
        "noise_shape",
        R"(Covariance of Gaussian noise in (i, q) up to a factor: only its shape counts, N0 comes from Es/N0.

decision: 'matched' where the detector knows it (distances in the whitened plane), 'nearest' where it takes plain distances.)")
        .def(py::init([](double ii, double iq, double qq, const std::string& decision) {
                 return noise_shape{ii, iq, qq, parse_metric(decision)};
             }),
             py::arg("ii") = 1.0,
             py::arg("iq") = 0.0,
             py::arg("qq") = 1.0,
             py::arg("decision") = "matched")
        .def_readonly("ii", &noise_shape::ii)
        .def_readonly("iq", &noise_shape::iq)
        .def_readonly("qq", &noise_shape::qq)
        .def_property_readonly("decision", [](const noise_shape& s) {
            return s.decision == metric::matched ? "matched" : "nearest";
        });
}

} // namespace halfplane::python
