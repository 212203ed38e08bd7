// SPDX-License-Identifier: GPL-3.0-or-later
// watch: tallies, gauges and predicts over the same symbols, and writes the report.
#pragma once

#include "halfplane/gauge.h"
#include "halfplane/link/aligner.h"
#include "halfplane/rates.h"
#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"
#include "halfplane/tally.h"

#include <nlohmann/json.hpp>

#include <complex>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>

namespace halfplane::link {

using report = nlohmann::ordered_json;

/// Es/N0 ahead of the receiver, and how it is known.
struct input_snr {
    double es_n0_db;
    double es_n0_db_se = 0;
    bool measured = false; ///< else declared
};

struct watch_options {
    std::string pattern;            ///< as the user wrote it; goes into the report
    detector rule = detector::automatic;
    bool receiver_decisions = false; ///< decisions come from the receiver, not from the nearest point
    double confidence = 0.95;
    double symbol_rate = 0;         ///< Hz; 0 where unknown (then no `seconds`)
    std::uint64_t window = 10000;   ///< symbols handed in, judged or not, after which a window closes; ≥ 1
    std::function<std::string()> clock; ///< UTC, RFC 3339; the system's clock where empty
};

/*!
 * The measurement itself, without threads: add() counts and gauges, and hands a closed window to `on_window`;
 * report_of() evaluates the rungs and is the expensive part. `reporter` puts the two on separate threads.
 */
class watch
{
public:
    /// Everything one window, or a run of merged windows, has to say before prediction.
    struct window {
        explicit window(const signal_set& set) : counts(set) {}
        std::uint64_t first_symbol = 0;
        std::uint64_t in = 0; ///< symbols handed in
        tally counts;
        halfplane::gauge fit;
        std::map<std::uint64_t, std::uint64_t> block_errors; ///< error count of a block of judged symbols → blocks
        std::optional<lock_status> lock;
        std::optional<input_snr> input;
        std::uint64_t pending = 0;
        void merge(const window& later);
    };

    watch(const signal_set& set, watch_options options);
    ~watch();

    /// Samples and references of equal length; `decided` only with receiver_decisions.
    /// Calls on_window(window&&) for each window that closes.
    void add(const std::complex<float>* in,
             const reference_t* reference,
             const std::uint16_t* decided,
             std::size_t count,
             const std::function<void(window&&)>& on_window);
    /// Closes the window that is open, if it holds anything.
    void close(const std::function<void(window&&)>& on_window);

    void set_lock(const lock_status& status);
    void set_input(const input_snr& input);
    void set_pending(std::uint64_t pending);

    /// Adds a window to the totals, evaluates the rungs, returns the report. One thread at a time.
    report report_of(window&& w);

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::link
