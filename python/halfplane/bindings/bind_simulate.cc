// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of the simulator: seeded links counted on all cores, and rare errors by importance sampling.
#include "outside_word.h"
#include "topics.h"

#include "halfplane/simulate.h"

#include <pybind11/complex.h>
#include <pybind11/stl.h>

#include <cmath>

namespace halfplane::python {
namespace {

/// What stops a simulation from outside: Ctrl-C, or a callback that returns False or raises.
class caller : public outside_word
{
public:
    explicit caller(py::object progress) : d_progress(std::move(progress)) {}

    bool operator()(const simulation_progress& p)
    {
        return goes_on(d_progress, p.fraction, p.counts.symbols, p.counts.symbol_errors);
    }

    bool operator()(double, double fraction) { return goes_on(d_progress, fraction); }

private:
    py::object d_progress;
};

simulation_options options_of(double es_n0_db,
                              const std::string& law,
                              const std::string& rule,
                              std::uint64_t errors,
                              std::uint64_t max_symbols,
                              std::uint64_t seed,
                              const std::optional<complexes>& means,
                              unsigned threads)
{
    simulation_options o;
    o.es_n0 = from_db(es_n0_db);
    o.channel = parse_law(law);
    o.rule = parse_detector(rule);
    o.wanted_errors = errors;
    o.max_symbols = max_symbols;
    o.seed = seed;
    if (means)
        o.means.assign(means->data(), means->data() + means->size());
    o.threads = threads;
    return o;
}

py::dict counted(const signal_set& set,
                 double es_n0_db,
                 const std::string& law,
                 const std::string& rule,
                 std::uint64_t errors,
                 std::uint64_t max_symbols,
                 std::uint64_t seed,
                 const std::optional<complexes>& means,
                 unsigned threads,
                 const py::object& progress,
                 double relative_width)
{
    auto options = options_of(es_n0_db, law, rule, errors, max_symbols, seed, means, threads);
    options.relative_width = relative_width;
    caller call(progress);
    auto result = [&] {
        py::gil_scoped_release free;
        return simulate(set, options, std::ref(call));
    }();
    py::dict out;
    out["seconds"] = result.seconds;
    out["cancelled"] = result.cancelled;
    out["interrupted"] = call.interrupted;
    out["counts"] = std::move(result.counts);
    return out;
}

py::dict estimated(const signal_set& set,
                   double es_n0_db,
                   double relative_error,
                   const std::string& law,
                   const std::string& rule,
                   std::uint64_t max_symbols,
                   std::uint64_t seed,
                   const std::optional<complexes>& means,
                   unsigned threads,
                   const py::object& progress)
{
    const auto options = options_of(es_n0_db, law, rule, 0, max_symbols, seed, means, threads);
    caller call(progress);
    const auto result = [&] {
        py::gil_scoped_release free;
        return simulate_rare(set, options, relative_error, std::ref(call));
    }();
    py::dict out;
    out["ser"] = result.ser.value;
    out["ser_se"] = result.ser.standard_error;
    out["ber"] = result.ber.value;
    out["ber_se"] = result.ber.standard_error;
    out["symbols"] = result.symbols;
    out["seconds"] = result.seconds;
    out["cancelled"] = result.cancelled;
    out["interrupted"] = call.interrupted;
    return out;
}

} // namespace

void bind_simulate(py::module_& m)
{
    m.def("simulate",
          &counted,
          py::arg("set"),
          py::arg("es_n0_db"),
          py::kw_only(),
          py::arg("law") = "awgn",
          py::arg("detector") = "automatic",
          py::arg("errors") = 200,
          py::arg("max_symbols") = 1000000000,
          py::arg("seed") = 1,
          py::arg("means") = py::none(),
          py::arg("threads") = 0,
          py::arg("progress") = py::none(),
          py::arg("relative_width") = 0.0,
          R"(Counts the errors of a seeded random link on all cores.

Stops at `errors` symbol errors (0: never), at `max_symbols`, or when the 95 % interval of the SER is narrower than
`relative_width` times the SER (0: never). The same seed and options give the same counts on any
number of threads. means: where each point is received, M complex numbers; at the points where left out.
progress(fraction, symbols, symbol_errors) is called ten times a second at most; False stops, and so does Ctrl-C: what
was counted stands. Returns a dict: counts (a tally), seconds, cancelled, interrupted.)");
    m.def("simulate_rare",
          &estimated,
          py::arg("set"),
          py::arg("es_n0_db"),
          py::kw_only(),
          py::arg("relative_error") = 0.05,
          py::arg("law") = "awgn",
          py::arg("detector") = "automatic",
          py::arg("max_symbols") = 1000000000,
          py::arg("seed") = 1,
          py::arg("means") = py::none(),
          py::arg("threads") = 0,
          py::arg("progress") = py::none(),
          R"(Error rates far below what counting reaches, by importance sampling; unbiased.

relative_error: wanted standard error of the SER over the SER, in (0, 1). Returns a dict: ser, ser_se, ber, ber_se
(standard errors), symbols, seconds, cancelled, interrupted. progress is called with the fraction alone.)");
    m.def(
        "displaced_points",
        [](const signal_set& set,
           double rotation,
           double gain_imbalance_db,
           double phase_imbalance,
           complex offset,
           double saturation,
           double compression_smoothness) {
            return array_of(displacement{
                rotation, gain_imbalance_db, phase_imbalance, offset, saturation, compression_smoothness}
                                .means(set));
        },
        py::arg("set"),
        py::kw_only(),
        py::arg("rotation") = 0.0,
        py::arg("gain_imbalance_db") = 0.0,
        py::arg("phase_imbalance") = 0.0,
        py::arg("offset") = complex(),
        py::arg("saturation") = 0.0,
        py::arg("compression_smoothness") = 2.0,
        R"(Where an imperfect radio delivers each point, for `means` and predictor.displaced().

In this order: compression (Rapp: saturation amplitude, 0 for none, and smoothness), imbalance (in-phase over
quadrature in dB, phase error in radians), rotation in radians, offset in the points' unit.)");
}

} // namespace halfplane::python
