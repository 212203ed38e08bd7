// SPDX-License-Identifier: GPL-3.0-or-later
// running_prediction: predicted errors over a run, each window's symbols at that window's gauge.
#pragma once

#include "expected_errors.h"
#include "halfplane/gauge.h"

#include <optional>
#include <utility>

namespace halfplane::link {

/// A predictor that keeps its last answer, as window and run mostly ask for the same.
class rate_memory
{
public:
    /// Refers to the predictor, which must outlive it.
    explicit rate_memory(const predictor& p) : d_predictor(p) {}
    const predictor& source() const { return d_predictor; }
    const rates& at(double es_n0) const
    {
        if (!d_last || d_last->first != es_n0)
            d_last.emplace(es_n0, d_predictor.at(es_n0));
        return d_last->second;
    }

private:
    const predictor& d_predictor;
    mutable std::optional<std::pair<double, rates>> d_last;
};

/// Windows that cannot be gauged wait for one that can.
class running_prediction
{
public:
    running_prediction(const signal_set& set, bool with_transitions);
    void add(const rate_memory& rates, const signal_set& set, const tally& counts, const gauge& fit);
    /// Over all symbols; what still waits is predicted at the gauge of the run, for this answer alone.
    std::optional<expected_errors>
    of_run(const rate_memory& rates, const signal_set& set, const gauge& of_all) const;

    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("expected", d_expected);
        a("waiting_counts", d_waiting_counts);
        a("waiting_fit", d_waiting_fit);
    }

private:
    expected_errors d_expected;
    tally d_waiting_counts;
    gauge d_waiting_fit;
};

} // namespace halfplane::link
