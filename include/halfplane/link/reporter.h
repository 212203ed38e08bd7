// SPDX-License-Identifier: GPL-3.0-or-later
// reporter: a watch whose predictions never hold up the stream.
#pragma once

#include "halfplane/link/watch.h"

#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>

namespace halfplane::link {

struct reporter_options {
    /// Seconds from one report to the next at least; 0: as fast as predictions come.
    double least_interval = 0.1;
    /// Called with each report on the worker's thread. What it throws is counted and goes no further.
    std::function<void(const report&)> on_report;
};

/*!
 * Counts on the caller's thread and predicts on its own. While a prediction is under way, or the last report
 * is too young, windows that close are merged into one: a report may speak of a longer window than was asked
 * for, but no symbol is ever left out and the totals are exact. All members may be called from any thread;
 * calls of add() are taken one after another.
 */
class reporter
{
public:
    /// Starts the worker. \throws std::invalid_argument as watch does, or where least_interval is negative or
    /// not finite
    reporter(const signal_set& set, watch_options options, reporter_options how = {});
    /// Stops first.
    ~reporter();
    reporter(const reporter&) = delete;
    reporter& operator=(const reporter&) = delete;

    /// As watch::add(); never waits for a prediction. After stop() symbols are still counted, and reported by
    /// the next start() or stop().
    void add(const std::complex<float>* in,
             const reference_t* reference,
             const std::uint16_t* decided,
             std::size_t count);
    void set_lock(const lock_status& status);
    void set_input(const input_snr& input);
    void set_pending(std::uint64_t pending);

    /// The last report that was made.
    std::optional<report> latest() const;
    /// What watch::carry() says of the run up to the report at hand, as text. From within `on_report` only.
    std::string carry() const;
    /// Of the report at hand: the latest samples of its window, at most recent_samples::most. From within
    /// `on_report` only.
    const std::vector<std::complex<float>>& recent_samples() const noexcept;
    /// How many were made, and how many windows were merged into a later report because the worker was late.
    std::uint64_t reports() const;
    std::uint64_t merged_windows() const;
    /// How often a prediction or `on_report` threw, and what the last one said.
    std::uint64_t failures() const;
    std::string last_failure() const;

    /// What watch::settings() says.
    nlohmann::json settings() const;

    /// Starts the worker again after stop(); nothing where it runs.
    void start();
    /// Closes the open window, makes the final report of everything handed in, joins the worker. Harmless
    /// when stopped.
    void stop();

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::link
