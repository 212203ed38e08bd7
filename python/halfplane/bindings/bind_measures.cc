// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of what is counted on a link: intervals, tally, gauge, pattern.
#include "topics.h"

#include "halfplane/blind_gauge.h"
#include "halfplane/gauge.h"
#include "halfplane/interval.h"
#include "halfplane/pattern.h"
#include "halfplane/tally.h"

#include <pybind11/complex.h>
#include <pybind11/stl.h>

#include <cmath>
#include <cstdint>

namespace halfplane::python {
namespace {

using indices = py::array_t<std::int64_t, py::array::c_style | py::array::forcecast>;

py::tuple pair_of(const interval& i)
{
    return py::make_tuple(i.low, i.high);
}

void bind_intervals(py::module_& m)
{
    m.def(
        "binomial_interval",
        [](std::uint64_t errors, std::uint64_t trials, double confidence) {
            return pair_of(binomial_interval(errors, trials, confidence));
        },
        py::arg("errors"),
        py::arg("trials"),
        py::arg("confidence") = 0.95,
        "(low, high) of the exact binomial interval of Clopper and Pearson for an error rate.\n\n"
        "With no errors low is None and high is one-sided. ValueError unless errors <= trials, trials > 0 "
        "and\n"
        "0 < confidence < 1.");
    m.def(
        "clumped_interval",
        [](std::uint64_t errors, std::uint64_t trials, double dispersion, double confidence) {
            return pair_of(clumped_interval(errors, trials, dispersion, confidence));
        },
        py::arg("errors"),
        py::arg("trials"),
        py::arg("dispersion"),
        py::arg("confidence") = 0.95,
        "(low, high) for a rate whose errors come in clumps of dispersion sum(h^2)/sum(h): exact Poisson "
        "interval of\n"
        "errors / dispersion, scaled back. Dispersions below 1 are taken as 1.");
}

/// Indices of symbols, checked to be below `size`; the core does not check.
std::vector<std::uint16_t> checked(const indices& values, std::size_t size, const char* what)
{
    if (values.ndim() != 1)
        throw std::invalid_argument(std::string(what) + ": expected one dimension");
    std::vector<std::uint16_t> out(static_cast<std::size_t>(values.size()));
    for (std::size_t k = 0; k < out.size(); ++k) {
        const std::int64_t index = values.data()[k];
        if (index < 0 || static_cast<std::uint64_t>(index) >= size)
            throw std::invalid_argument(std::string(what) + " of symbol " + std::to_string(k) + ": " +
                                        std::to_string(index) + " is no index of a set of " +
                                        std::to_string(size));
        out[k] = static_cast<std::uint16_t>(index);
    }
    return out;
}

void same_length(std::size_t a, std::size_t b, const char* what)
{
    if (a != b)
        throw std::invalid_argument(std::string(what) + ": lengths " + std::to_string(a) + " and " +
                                    std::to_string(b) + " differ");
}

void count_all(tally& t, const indices& sent, const indices& decided)
{
    const auto s = checked(sent, t.sent.size(), "sent");
    const auto d = checked(decided, t.sent.size(), "decided");
    same_length(s.size(), d.size(), "sent and decided");
    py::gil_scoped_release free;
    t.count(s.data(), d.data(), s.size());
}

void bind_tally(py::module_& m)
{
    py::class_<tally>(m, "tally", "Running counts of symbols, errors, bits and transitions.")
        .def(py::init<const signal_set&>(), py::arg("set"))
        .def("count",
             &count_all,
             py::arg("sent"),
             py::arg("decided"),
             "Counts two arrays of indices against each other.")
        .def("merge", &tally::merge, py::arg("later"), "Adds the counts of an adjacent stretch.")
        .def_readonly("symbols", &tally::symbols)
        .def_readonly("symbol_errors", &tally::symbol_errors)
        .def_readonly("bits", &tally::bits)
        .def_readonly("bit_errors", &tally::bit_errors)
        .def_readonly("nonfinite", &tally::nonfinite)
        .def_property_readonly(
            "bit_dispersion", &tally::bit_dispersion, "sum(h^2)/sum(h), h the wrong bits of a symbol.")
        .def_property_readonly(
            "sent", [](const tally& t) { return array_of(t.sent); }, "Judged symbols by index sent.")
        .def_property_readonly(
            "by_bit", [](const tally& t) { return array_of(t.by_bit); }, "Bit errors by position.")
        .def_property_readonly(
            "transitions",
            [](const tally& t) {
                py::dict out;
                for (const transition& each : t.transitions.sorted())
                    out[py::make_tuple(each.from, each.to)] = each.count;
                return out;
            },
            "{(sent, decided): count}, errors only.");
}

/// A gauge of one set, so that points and priors cannot be mixed up between calls.
class set_gauge
{
public:
    explicit set_gauge(const signal_set& set) : d_set(set) {}

    void add(const complexes& received, const indices& sent, const indices& decided)
    {
        const auto s = checked(sent, d_set.size(), "sent");
        const auto d = checked(decided, d_set.size(), "decided");
        const std::vector<std::complex<float>> r(received.data(), received.data() + received.size());
        same_length(s.size(), d.size(), "sent and decided");
        same_length(s.size(), r.size(), "sent and received");
        for (std::size_t k = 0; k < r.size(); ++k)
            if (!std::isfinite(r[k].real()) || !std::isfinite(r[k].imag()))
                throw std::invalid_argument("received sample " + std::to_string(k) + " is not finite");
        py::gil_scoped_release free;
        d_gauge.add(r.data(), s.data(), d.data(), r.size(), d_set.points());
    }

    void merge(const set_gauge& later) { d_gauge.merge(later.d_gauge); }
    std::uint64_t count() const { return d_gauge.count(); }
    std::optional<gauge_result> solve() const { return d_gauge.solve(d_set); }

private:
    signal_set d_set;
    gauge d_gauge;
};

void bind_gauge(py::module_& m)
{
    py::class_<gauge_result>(m, "gauge_result", "Least squares over known symbols: r = gain·s + offset + e.")
        .def_readonly("gain", &gauge_result::gain, "Complex.")
        .def_readonly("offset", &gauge_result::offset, "Complex.")
        .def_readonly("n0", &gauge_result::n0, "Noise density, linear.")
        .def_property_readonly("es_n0_db", [](const gauge_result& r) { return 10 * std::log10(r.es_n0); })
        .def_readonly("es_n0_db_se", &gauge_result::es_n0_db_se, "Standard error of es_n0_db.")
        .def_readonly("evm_rms", &gauge_result::evm_rms, "A ratio.")
        .def_readonly("mer_db", &gauge_result::mer_db);
    py::class_<set_gauge>(
        m, "gauge", "Estimates of gain, offset and noise from received points whose symbols are known.")
        .def(py::init<const signal_set&>(), py::arg("set"))
        .def("add",
             &set_gauge::add,
             py::arg("received"),
             py::arg("sent"),
             py::arg("decided"),
             "received: finite complex samples; sent, decided: indices. All of one length; ValueError "
             "otherwise.")
        .def("merge", &set_gauge::merge, py::arg("later"), "Adds an adjacent stretch.")
        .def_property_readonly("count", &set_gauge::count, "Symbols so far.")
        .def("solve",
             &set_gauge::solve,
             "A gauge_result; None with fewer than 3 symbols, one point only, or no noise.");
}

/// Of a whole array; what is not finite has no place in a likelihood.
std::optional<blind_result> gauged_blindly(const signal_set& set, const complexes& received)
{
    const std::vector<std::complex<float>> r(received.data(), received.data() + received.size());
    for (std::size_t k = 0; k < r.size(); ++k)
        if (!std::isfinite(r[k].real()) || !std::isfinite(r[k].imag()))
            throw std::invalid_argument("received sample " + std::to_string(k) + " is not finite");
    py::gil_scoped_release free;
    thinned_samples thinned;
    thinned.add(r.data(), 0, r.size());
    return blind_gauge(set).solve(thinned.kept());
}

void bind_blind_gauge(py::module_& m)
{
    py::class_<blind_result>(
        m,
        "blind_result",
        "Maximum likelihood over the mixture of all points: r = gain·s + offset + e, s unknown.")
        .def_readonly("gain",
                      &blind_result::gain,
                      "Complex; of the turns that carry the set into itself the one nearest to angle 0.")
        .def_readonly("offset", &blind_result::offset, "Complex.")
        .def_readonly("n0", &blind_result::n0, "Noise variance, complex.")
        .def_property_readonly("es_n0_db", [](const blind_result& r) { return 10 * std::log10(r.es_n0); })
        .def_readonly("es_n0_db_se",
                      &blind_result::es_n0_db_se,
                      "Standard error of es_n0_db, from the observed information.")
        .def_readonly("samples", &blind_result::samples, "Samples that the likelihood was taken over.");
    m.def(
        "gauge_blindly",
        &gauged_blindly,
        py::arg("set"),
        py::arg("received"),
        R"doc(Gain, offset, noise and Es/N0 of live traffic, where nobody knows what was sent: a blind_result.

received: finite complex samples, one a symbol, of any gain, near the right phase; of more than 32,768 a part is taken,
evenly and without a period. Points are taken to be sent by their priors, noise to be Gaussian. With 20,000 samples and a
symbol error rate up to 0.3 the bias is below 0.05 dB and the variance within 1.2 times the Cramér-Rao bound.

None with fewer than 100 samples, without noise, or where the standard error is beyond 3 dB. ValueError where a sample is
not finite.)doc");
}

void bind_pattern(py::module_& m)
{
    py::class_<pattern>(m, "pattern", R"(A periodic sequence of indices that both ends of a link know.

text: o150:N (ITU-T O.150; 9, 11, 15, 20, 23, 29 or 31 stages), draw:SEED[:PERIOD], or file:PATH.
Raises ValueError naming the part that is not understood, or why the set cannot carry it.)")
        .def(py::init<const std::string&, const signal_set&>(), py::arg("text"), py::arg("set"))
        .def_property_readonly("text", &pattern::text)
        .def_property_readonly("period", &pattern::period, "Symbols after which the indices repeat.")
        .def(
            "indices",
            [](const pattern& p, std::uint64_t first, std::size_t count) {
                py::array_t<std::uint16_t> out(static_cast<py::ssize_t>(count));
                std::uint16_t* to = out.mutable_data();
                py::gil_scoped_release free;
                p.indices(first, count, to);
                return out;
            },
            py::arg("first"),
            py::arg("count"),
            "The indices of symbols first … first + count − 1.");
}

} // namespace

void bind_measures(py::module_& m)
{
    bind_intervals(m);
    bind_tally(m);
    bind_gauge(m);
    bind_blind_gauge(m);
    bind_pattern(m);
}

} // namespace halfplane::python
