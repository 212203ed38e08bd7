// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of what a set carries, and of how long a test takes.
#include "topics.h"

#include "halfplane/information.h"
#include "halfplane/planning.h"
#include "halfplane/rates.h"

#include <pybind11/stl.h>

namespace halfplane::python {
namespace {

py::dict information_over(const signal_set& set, const doubles& es_n0_db)
{
    py::array_t<double> mi(shape_of(es_n0_db)), bmd(shape_of(es_n0_db));
    const double* in = es_n0_db.data();
    double *mi_out = mi.mutable_data(), *bmd_out = bmd.mutable_data();
    const auto count = static_cast<std::size_t>(es_n0_db.size());
    {
        py::gil_scoped_release free;
        parallel_for(count, [&](std::size_t k) {
            const information i = information_at(set, from_db(in[k]));
            mi_out[k] = i.mi;
            bmd_out[k] = i.bmd_rate;
        });
    }
    py::dict out;
    out["mi"] = number_or_array(std::move(mi));
    out["bmd_rate"] = number_or_array(std::move(bmd));
    return out;
}

py::list plan_rows(double target,
                   double confidence,
                   double trials_per_symbol,
                   double symbol_rate,
                   double dispersion,
                   const std::vector<std::uint64_t>& allowed)
{
    py::list out;
    for (const plan_row& row :
         plan({target, confidence, trials_per_symbol, symbol_rate, dispersion}, allowed)) {
        py::dict one;
        one["allowed_errors"] = row.test.allowed;
        one["trials"] = row.test.trials;
        one["symbols"] = row.symbols;
        if (symbol_rate > 0)
            one["seconds"] = row.seconds;
        one["rate_half_pass"] = row.rate_half_pass;
        one["rate_usually_pass"] = row.rate_usually_pass;
        out.append(one);
    }
    return out;
}

} // namespace

void bind_planning(py::module_& m)
{
    m.attr("information_accuracy") = information_accuracy;
    m.def("information",
          &information_over,
          py::arg("set"),
          py::arg("es_n0_db"),
          "{'mi', 'bmd_rate'} in bits a symbol over AWGN, each in the shape of es_n0_db (dB).");
    m.def(
        "shannon_gap_db",
        [](const signal_set& set, const doubles& es_n0_db) {
            return over(es_n0_db, [&](double db) { return shannon_gap_db(set, from_db(db)); });
        },
        py::arg("set"),
        py::arg("es_n0_db"),
        "Es/N0 in dB minus the one at which log2(1 + Es/N0) is the entropy of the set.");
    m.def(
        "capacity_gap_db",
        [](const doubles& es_n0_db, const doubles& bits) {
            return py::vectorize([](double db, double b) { return capacity_gap_db(from_db(db), b); })(
                es_n0_db, bits);
        },
        py::arg("es_n0_db"),
        py::arg("bits"),
        "dB between Es/N0 and the Es/N0 at which log2(1 + Es/N0) is `bits`: what a set that carries `bits` "
        "there (its mi, or "
        "its\n"
        "bmd_rate) gives away against capacity. Both broadcast. bits > 0.");
    m.def(
        "es_n0_db_for_information",
        [](const signal_set& set, const doubles& bits) {
            return over(bits, [&](double b) {
                const auto found = es_n0_for_information(set, b);
                if (!found)
                    throw std::invalid_argument("the set never carries " + std::to_string(b) +
                                                " bits a symbol");
                return to_db(*found);
            });
        },
        py::arg("set"),
        py::arg("bits"),
        "Es/N0 in dB at which the mutual information reaches `bits`. ValueError where it never does.");
    m.def("plan",
          &plan_rows,
          py::arg("target"),
          py::kw_only(),
          py::arg("confidence") = 0.95,
          py::arg("trials_per_symbol") = 1.0,
          py::arg("symbol_rate") = 0.0,
          py::arg("dispersion") = 1.0,
          py::arg("allowed") = std::vector<std::uint64_t>{0, 1, 3, 10, 30, 100},
          "The shortest tests of an error rate, one dict for each number of allowed errors: allowed_errors, "
          "trials,\n"
          "symbols, seconds (with a symbol rate in Hz), rate_half_pass, rate_usually_pass: the true rates at "
          "which\n"
          "half of such tests pass, and a share `confidence` of them.");
    m.def(
        "pass_probability",
        [](std::uint64_t trials, std::uint64_t allowed, const doubles& rate) {
            return over(rate, [&](double r) { return pass_probability({trials, allowed}, r); });
        },
        py::arg("trials"),
        py::arg("allowed"),
        py::arg("rate"),
        "Chance that at most `allowed` errors are counted in `trials` at a true rate, or at each of an "
        "array.");
}

} // namespace halfplane::python
