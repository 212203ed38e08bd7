// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of the predictor: rates of every rung, vectorised over Es/N0 in dB.
#include "topics.h"

#include "halfplane/rates.h"

#include <pybind11/stl.h>

#include <algorithm>
#include <sstream>

namespace halfplane::python {
namespace {

double linear(double es_n0_db)
{
    return from_db(es_n0_db);
}

/// The four figures of one rung, each in the shape of the Es/N0 that were asked for.
class rung_arrays
{
public:
    explicit rung_arrays(const doubles& es_n0_db)
        : d_ser(shape_of(es_n0_db)), d_ber(shape_of(es_n0_db)), d_ln_ser(shape_of(es_n0_db)),
          d_ln_ber(shape_of(es_n0_db)), d_ber_if_gray(shape_of(es_n0_db)), d_at{d_ser.mutable_data(),
                                                                                d_ber.mutable_data(),
                                                                                d_ln_ser.mutable_data(),
                                                                                d_ln_ber.mutable_data(),
                                                                                d_ber_if_gray.mutable_data()}
    {
    }

    void set(std::size_t k, const rung& r)
    {
        d_at[0][k] = r.ser;
        d_at[1][k] = r.ber;
        d_at[2][k] = r.ln_ser;
        d_at[3][k] = r.ln_ber;
        d_at[4][k] = r.ber_if_gray;
    }

    py::dict dict()
    {
        py::dict out;
        out["ser"] = number_or_array(d_ser);
        out["ber"] = number_or_array(d_ber);
        out["ln_ser"] = number_or_array(d_ln_ser);
        out["ln_ber"] = number_or_array(d_ln_ber);
        out["ber_if_gray"] = number_or_array(d_ber_if_gray);
        return out;
    }

private:
    py::array_t<double> d_ser, d_ber, d_ln_ser, d_ln_ber, d_ber_if_gray;
    double* d_at[5];
};

/// The same and the lists of the exact rung, each with one more dimension.
class exact_arrays : public rung_arrays
{
public:
    exact_arrays(const predictor& p, const doubles& es_n0_db)
        : rung_arrays(es_n0_db), d_by_point(shape_of(es_n0_db, {static_cast<py::ssize_t>(p.set().size())})),
          d_by_bit(shape_of(es_n0_db, {static_cast<py::ssize_t>(p.set().label_bits())})),
          d_point_at(d_by_point.mutable_data()), d_bit_at(d_by_bit.mutable_data())
    {
    }

    void set(std::size_t k, const exact_rung& r)
    {
        rung_arrays::set(k, r);
        std::copy(r.ser_by_point.begin(), r.ser_by_point.end(), d_point_at + k * r.ser_by_point.size());
        std::copy(r.ber_by_bit.begin(), r.ber_by_bit.end(), d_bit_at + k * r.ber_by_bit.size());
    }

    py::dict dict()
    {
        py::dict out = rung_arrays::dict();
        out["ser_by_point"] = d_by_point;
        out["ber_by_bit"] = d_by_bit;
        return out;
    }

private:
    py::array_t<double> d_by_point, d_by_bit;
    double *d_point_at, *d_bit_at;
};

py::dict rates_over(const predictor& p, const doubles& es_n0_db)
{
    exact_arrays exact(p, es_n0_db);
    rung_arrays facing(es_n0_db), union_bound(es_n0_db), nearest(es_n0_db);
    const double* in = es_n0_db.data();
    const auto count = static_cast<std::size_t>(es_n0_db.size());
    {
        py::gil_scoped_release free;
        parallel_for(count, [&](std::size_t k) {
            const rates r = p.at(linear(in[k]));
            exact.set(k, r.exact);
            facing.set(k, r.facing);
            union_bound.set(k, r.union_bound);
            nearest.set(k, r.nearest);
        });
    }
    py::dict out;
    out["exact"] = exact.dict();
    out["facing"] = facing.dict();
    out["union"] = union_bound.dict();
    out["nearest"] = nearest.dict();
    return out;
}

/// The exact rung, found by f(p, Es/N0).
template <typename F>
py::dict exact_over(const predictor& p, const doubles& es_n0_db, F f)
{
    exact_arrays exact(p, es_n0_db);
    const double* in = es_n0_db.data();
    const auto count = static_cast<std::size_t>(es_n0_db.size());
    {
        py::gil_scoped_release free;
        parallel_for(count, [&](std::size_t k) { exact.set(k, f(linear(in[k]))); });
    }
    return exact.dict();
}

/// Means by index, or what a function makes of each point.
py::dict displaced_over(const predictor& p, const doubles& es_n0_db, const py::object& means)
{
    std::vector<complex> places;
    if (py::isinstance<py::function>(means)) {
        for (const complex point : p.set().points())
            places.push_back(means(point).cast<complex>());
    } else {
        const auto array = means.cast<complexes>();
        places.assign(array.data(), array.data() + array.size());
    }
    return exact_over(p, es_n0_db, [&](double es_n0) { return p.displaced(es_n0, places); });
}

py::dict displaced_among_over(const predictor& p,
                              const doubles& es_n0_db,
                              const std::vector<std::size_t>& sent,
                              const complexes& means,
                              const doubles& weights)
{
    const auto count = static_cast<py::ssize_t>(sent.size());
    if (means.size() != count || weights.size() != count)
        throw std::invalid_argument("sent, means and weights must be of one length, got " +
                                    std::to_string(count) + ", " + std::to_string(means.size()) + " and " +
                                    std::to_string(weights.size()));
    std::vector<displaced_point> arrivals;
    for (std::size_t k = 0; k < sent.size(); ++k)
        arrivals.push_back({sent[k], means.data()[k], weights.data()[k]});
    return exact_over(p, es_n0_db, [&](double es_n0) { return p.displaced_among(es_n0, arrivals); });
}

py::array_t<double> transition_rows_over(const predictor& p, const doubles& es_n0_db, std::size_t index)
{
    const std::size_t size = p.set().size();
    py::array_t<double> out(shape_of(es_n0_db, {static_cast<py::ssize_t>(size)}));
    double* to = out.mutable_data();
    const double* in = es_n0_db.data();
    const auto count = static_cast<std::size_t>(es_n0_db.size());
    py::gil_scoped_release free;
    parallel_for(count, [&](std::size_t k) {
        const auto row = p.transition_row(linear(in[k]), index);
        std::copy(row.begin(), row.end(), to + k * size);
    });
    return out;
}

/// A law as its text or as a law object.
std::shared_ptr<const law> law_from(const py::object& given)
{
    if (py::isinstance<law>(given))
        return given.cast<std::shared_ptr<law>>();
    return parse_law(given.cast<std::string>());
}

py::array_t<double> transitions_over(const predictor& p, const doubles& es_n0_db)
{
    const std::size_t size = p.set().size();
    const auto extent = static_cast<py::ssize_t>(size);
    py::array_t<double> out(shape_of(es_n0_db, {extent, extent}));
    double* to = out.mutable_data();
    const double* in = es_n0_db.data();
    const auto count = static_cast<std::size_t>(es_n0_db.size());
    py::gil_scoped_release free;
    parallel_for(count, [&](std::size_t k) {
        const auto all = p.transitions(linear(in[k]));
        std::copy(all.begin(), all.end(), to + k * size * size);
    });
    return out;
}

/// Es/N0 in dB for a target rate; an error where one cannot be reached, which is better than a number that is
/// none.
template <typename Solve>
py::object inverse_over(const doubles& target, const char* what, Solve solve)
{
    return over(target, [&](double rate) {
        const auto found = solve(rate);
        if (!found) {
            std::ostringstream text;
            text << what << " " << rate << " cannot be reached between -60 dB and 200 dB";
            throw std::invalid_argument(text.str());
        }
        return to_db(*found);
    });
}

using rate_at = double (predictor::*)(double, rung_name) const;

template <rate_at Rate>
py::object rate_over(const predictor& p, const doubles& es_n0_db, const std::string& rung)
{
    const rung_name name = parse_rung(rung);
    return over(es_n0_db, [&](double db) { return (p.*Rate)(linear(db), name); });
}

void check_index(const predictor& p, std::size_t index)
{
    if (index >= p.set().size())
        throw py::index_error("index " + std::to_string(index) + " of a set of " +
                              std::to_string(p.set().size()));
}

} // namespace

void bind_rates(py::module_& m)
{
    py::class_<predictor>(
        m, "predictor", R"(Predicted error rates of one set under one channel law and detector.

set: a signal_set. law: a law, or as the command line writes it ("awgn", "rayleigh", "rician:6", …).
detector: "map", "ml" or "automatic" (MAP where the priors differ, nearest point otherwise).
noise: a noise_shape where the noise is not circular.
rung, wherever it is asked for: "exact", "facing", "union" or "nearest".
Es/N0 is in dB, a number or an array of any shape; rates come back in that shape. Raises ValueError where a law, a
detector, a rung or an Es/N0 is refused.)")
        .def(py::init([](const signal_set& set,
                         const py::object& law,
                         const std::string& rule,
                         const noise_shape& shape) {
                 return std::make_unique<predictor>(set, law_from(law), parse_detector(rule), shape);
             }),
             py::arg("set"),
             py::arg("law") = "awgn",
             py::arg("detector") = "automatic",
             py::arg_v("noise", noise_shape{}, "noise_shape()"))
        .def_property_readonly("set", &predictor::set)
        .def_property_readonly("law", [](const predictor& p) { return p.channel().name(); })
        .def_property_readonly(
            "detector",
            [](const predictor& p) { return p.rule() == detector::map ? "map" : "ml"; },
            "\"map\" or \"ml\", never \"automatic\".")
        .def("ser",
             &rate_over<&predictor::ser>,
             py::arg("es_n0_db"),
             py::arg("rung") = "exact",
             "Symbol error rate.")
        .def("ber",
             &rate_over<&predictor::ber>,
             py::arg("es_n0_db"),
             py::arg("rung") = "exact",
             "Bit error rate.")
        .def("ln_ser",
             &rate_over<&predictor::ln_ser>,
             py::arg("es_n0_db"),
             py::arg("rung") = "exact",
             "Natural logarithm of the symbol error rate; holds where the rate itself is below the smallest "
             "double.")
        .def("ln_ber",
             &rate_over<&predictor::ln_ber>,
             py::arg("es_n0_db"),
             py::arg("rung") = "exact",
             "Natural logarithm of the bit error rate.")
        .def("rates", &rates_over, py::arg("es_n0_db"), R"(All rungs at once, as a dict of dicts of arrays:
exact, facing, union, nearest, each with ser, ber, ln_ser, ln_ber, ber_if_gray in the shape of es_n0_db; exact also with
ser_by_point (one more dimension of M, by index) and ber_by_bit (one more of label_bits, the leftmost bit first).)")
        .def("transitions",
             &transitions_over,
             py::arg("es_n0_db"),
             "P(decided j | sent i) as [..., i, j], two more dimensions than es_n0_db; each row sums to 1.")
        .def(
            "transition_row",
            [](const predictor& p, const doubles& es_n0_db, std::size_t index) {
                check_index(p, index);
                return transition_rows_over(p, es_n0_db, index);
            },
            py::arg("es_n0_db"),
            py::arg("index"),
            "P(decided j | sent index) for all j, one more dimension than es_n0_db.")
        .def("displaced",
             &displaced_over,
             py::arg("es_n0_db"),
             py::arg("means"),
             "Exact rates where point i arrives at means[i] while the detector stays as it is: a dict of "
             "arrays as\n"
             "rates()['exact']. means: M finite complex numbers, or a function from a point to its mean.")
        .def("displaced_among",
             &displaced_among_over,
             py::arg("es_n0_db"),
             py::arg("sent"),
             py::arg("means"),
             py::arg("weights"),
             "The same for any number of places a point: with probability weights[k] point sent[k] is sent "
             "and arrives at "
             "means[k]\n"
             "(one for each interfering neighbour, say). Three arrays of one length; weights sum to 1.")
        .def(
            "expected_counts",
            [](const predictor& p, double es_n0_db, const std::vector<std::uint64_t>& sent) {
                const auto size = static_cast<py::ssize_t>(p.set().size());
                const auto counts = p.expected_counts(linear(es_n0_db), sent);
                return py::array_t<double>({size, size}, counts.data());
            },
            py::arg("es_n0_db"),
            py::arg("sent"),
            "Expected confusion counts [i, j] where point i was sent sent[i] times.")
        .def("ser_decades_per_db",
             &rate_over<&predictor::ser_decades_per_db>,
             py::arg("es_n0_db"),
             py::arg("rung") = "exact",
             "Steepness d log10(SER) / d(Es/N0 in dB), negative.")
        .def("ber_decades_per_db",
             &rate_over<&predictor::ber_decades_per_db>,
             py::arg("es_n0_db"),
             py::arg("rung") = "exact",
             "Steepness d log10(BER) / d(Es/N0 in dB).")
        .def(
            "facing",
            [](const predictor& p, double es_n0_db) {
                std::vector<std::vector<std::size_t>> all;
                for (std::size_t i = 0; i < p.set().size(); ++i)
                    all.push_back(p.facing(linear(es_n0_db), i));
                return all;
            },
            py::arg("es_n0_db") = 0.0,
            "By point, the indices that it faces. Depends on Es/N0 with unequal priors only.")
        .def(
            "es_n0_db_for_ser",
            [](const predictor& p, const doubles& target, const std::string& rung) {
                const auto name = parse_rung(rung);
                return inverse_over(target, "SER", [&](double t) { return p.es_n0_for_ser(t, name); });
            },
            py::arg("target"),
            py::arg("rung") = "exact",
            "Es/N0 in dB beyond which the rung stays at or below the target. ValueError where that is "
            "nowhere.")
        .def(
            "es_n0_db_for_ber",
            [](const predictor& p, const doubles& target, const std::string& rung) {
                const auto name = parse_rung(rung);
                return inverse_over(target, "BER", [&](double t) { return p.es_n0_for_ber(t, name); });
            },
            py::arg("target"),
            py::arg("rung") = "exact",
            "The same for the bit error rate.");
}

} // namespace halfplane::python
