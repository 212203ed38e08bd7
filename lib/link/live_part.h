// SPDX-License-Identifier: GPL-3.0-or-later
// live_part: what a report says of live traffic: nothing counted, the gauge blind, the rates predicted.
#pragma once

#include "halfplane/blind_gauge.h"
#include "halfplane/link/watch.h"
#include "running_prediction.h"

#include <optional>

namespace halfplane::link {

/*!
 * Es/N0 of the run is the mean in dB over stretches of at least `stretch_symbols`, weighted by their symbols,
 * and rates are Σ n·rate(γ) over them. Shorter ones wait, since the bias of a maximum of likelihood falls
 * with the number of samples.
 */
class live_part
{
public:
    static constexpr std::uint64_t stretch_symbols = 10000;

    explicit live_part(const signal_set& set) : d_set(set), d_gauge(set) {}

    /// \param known the gauge of the window's known symbols: one place where the search may start
    void
    add(const rate_memory& rates, const thinned_samples& of_window, const std::optional<gauge_result>& known);
    /// Of the window last added; empty where it had no live symbol.
    const report& of_window() const { return d_window; }
    /// Of the run. \param symbols of live traffic in it
    report of_run(const rate_memory& rates, std::uint64_t symbols) const;

    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("gauged", d_gauged);
        a("waiting", d_waiting);
        a("found", d_found);
        a("gain", d_latest.gain);
        a("offset", d_latest.offset);
        a("n0", d_latest.n0);
    }

private:
    /// Sums over gauged stretches, n their symbols.
    struct sums {
        expected_errors expected;
        std::uint64_t sampled = 0;
        double db = 0, variance = 0; // Σ n·γ in dB, Σ n²·se²
        void add(const rate_memory& rates, const blind_result& fit, std::uint64_t symbols);

        template <typename Archive>
        void carry(Archive& a)
        {
            a("expected", expected);
            a("sampled", sampled);
            a("db", db);
            a("variance", variance);
        }
    };

    const signal_set d_set;
    const blind_gauge d_gauge;
    std::vector<blind_start> d_starts; // known symbols of the latest window, the latest blind fit
    bool d_found = false;
    blind_start d_latest; // where `found`
    report d_window;
    sums d_gauged;
    thinned_samples d_waiting;
};

} // namespace halfplane::link
