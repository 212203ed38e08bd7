// SPDX-License-Identifier: GPL-3.0-or-later
// watch: tallies, gauges and predicts over the same symbols, and writes the report.
#pragma once

#include "halfplane/blind_gauge.h"
#include "halfplane/block_counts.h"
#include "halfplane/gauge.h"
#include "halfplane/link/aligner.h"
#include "halfplane/link/recent_samples.h"
#include "halfplane/link/trial.h"
#include "halfplane/rates.h"
#include "halfplane/residuals.h"
#include "halfplane/second_counts.h"
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
#include <vector>

namespace halfplane::link {

using report = nlohmann::ordered_json;

/// Es/N0 ahead of the receiver, and how it is known.
struct input_snr {
    double es_n0_db;
    double es_n0_db_se = 0; ///< dB, ≥ 0; an error shared by the whole run
    bool measured = false;  ///< else declared
};

struct watch_options {
    std::string pattern; ///< as the user wrote it; goes into the report
    detector rule = detector::automatic;
    bool receiver_decisions = false; ///< decisions come from the receiver, not from the nearest point
    double confidence = 0.95;        ///< of every interval, in (0, 1)
    double symbol_rate = 0;          ///< Hz; 0 where unknown; below 1 there are no `seconds`
    std::uint64_t window = 10000;    ///< symbols handed in, judged or not, after which a window closes; ≥ 1
    bool explain = true;             ///< gather what losses and premises are made of
    trial_options trial;             ///< frames, and the target of the verdict
    /*!
     * Path of the log of an earlier run with the same settings that is to go on: of what stands beside it as
     * PATH.carry. Empty, or a log that does not exist yet: a new run.
     */
    std::string resume;
    /// UTC, RFC 3339; the system's clock where empty. What gives no text leaves `time` out.
    std::function<std::string()> clock;
};

/*!
 * The measurement itself, without threads. It has two halves that share nothing and may live on two threads:
 * add(), close() and the setters count and gauge, and hand a closed window to `on_window`; report_of()
 * evaluates the rungs and is the expensive part. `reporter` puts the two on separate threads.
 *
 * MAP decisions (unequal priors) need N0: that of the window before, which is past; for the first window that
 * of the Es/N0 at the input; nearest point where neither is known.
 */
class watch
{
public:
    /// Everything one window, or a run of merged windows, has to say before prediction.
    struct window {
        explicit window(const signal_set& set) : counts(set) {}
        std::uint64_t first_symbol = 0; ///< place in the stream handed in, from 0
        tally counts;
        halfplane::gauge fit;
        residual_sums residuals;      ///< empty unless `explain`
        std::optional<tally> decoded; ///< symbols known only by decoding, and the gauge of these
        halfplane::gauge decoded_fit;
        thinned_samples live; ///< of the symbols nobody knows
        block_counts blocks;  ///< of the run up to the window's end
        second_counts
            seconds;       ///< of the run up to the window's end, complete ones; none without a symbol rate
        trial_state trial; ///< of the run up to the window's end
        std::optional<lock_status> lock;
        std::uint64_t pending = 0;
        double map_n0 = 0; ///< what decisions from here on are made with; 0: nearest point
        /// Judged symbols and their errors by what was known of the input meanwhile.
        struct input_part {
            input_snr input;
            std::uint64_t symbols, errors;
        };
        std::vector<input_part> inputs;
        std::optional<input_snr> input; ///< last known
        recent_samples recent;          ///< for pictures; no part of the report
        void merge(window&& later);
    };
    using window_handler = std::function<void(window&&)>;

    /// \throws std::invalid_argument naming the option and its value, or what of the settings to `resume`
    /// differs
    watch(const signal_set& set, watch_options options);
    ~watch();
    watch(watch&&) noexcept;

    /*!
     * Samples and references (symbol_code.h) of equal length, and decisions with `receiver_decisions` (else
     * null). Symbols known in advance are judged. Those known only by decoding have a tally and a gauge of
     * their own, since the frames that failed are missing among them; live traffic is gauged blindly. Calls
     * on_window for each window that closes. \throws std::invalid_argument where a reference or a decision is
     * no index of the set and no exclusion code: names place and value; the whole 1,024 symbols about it are
     * left uncounted
     */
    void add(const std::complex<float>* in,
             const reference_t* reference,
             const std::uint16_t* decided,
             std::size_t count,
             const window_handler& on_window);
    /// Closes the window that is open, if it holds anything; an empty one too where so asked.
    void close(const window_handler& on_window, bool even_empty = false);

    void set_lock(const lock_status& status);
    /// A declared value that differs from the one before closes the window that is open, at the next add().
    /// \throws std::invalid_argument unless finite, with a standard error ≥ 0
    void set_input(const input_snr& input);
    /// Symbols that the link took in and has not handed over yet (the aligner's hold-back).
    void set_pending(std::uint64_t pending);
    /// Symbols handed in so far.
    std::uint64_t handed_in() const noexcept;

    /// Adds a window to the totals, evaluates the rungs, returns the report; `final` marks it as the run's
    /// last.
    report report_of(window&& w, bool final = false);

    /// What must be equal for two runs to be one: the document whose digest the report carries.
    nlohmann::json settings() const;

    /*!
     * All that another watch needs to go on after the last report that was made: sums of the run, exactly;
     * what was known of lock and input is not among them. For the thread that calls report_of().
     */
    nlohmann::json carry() const;

private:
    void restore(const nlohmann::json& carried);
    struct counting;
    struct reporting;
    std::unique_ptr<counting> d_count;
    std::unique_ptr<reporting> d_report;
};

} // namespace halfplane::link
