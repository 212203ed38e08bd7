// SPDX-License-Identifier: GPL-3.0-or-later
// link_watch: counts errors, gauges the points, and sets the predicted rates beside the count.
#pragma once

#include "halfplane/signal_set.h"

#include <gnuradio/sync_block.h>

#include <cstdint>
#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * In 0: complex samples, one a symbol. In 1 (int16): the index sent, or a negative code that excludes the
 * symbol (see `aligner`). In 2 (int16, only with decisions = "receiver"): the receiver's decisions, −1 where
 * it has none.
 *
 * A window closes after `window` symbols, judged or not; a thread of the block's own predicts and reports,
 * never holding up the stream. Message port `report` (out): the report as a dict (report_pmt.h), with the
 * settings it was made under as `settings`: set, points, labels, priors …, what `settings_sha256` is the
 * digest of; and the latest judged samples of the window, at most 256, as `cloud` (c32vector), which views
 * show and no log keeps. Message port `input` (in): {es_n0_db, es_n0_db_se, source} ahead of the receiver,
 * from `noise_at` or a meter. The tags `lock` and `pending` of `aligner` are read on input 1.
 *
 * When the flowgraph ends, the open window is closed and reported too: by then every report has been
 * published, and report() is the last one. A `link_log` on the `report` port has written each of them.
 */
class link_watch : virtual public gr::sync_block
{
public:
    using sptr = std::shared_ptr<link_watch>;

    /*!
     * \param set         the constellation
     * \param pattern     the pattern's text, for the report; may be empty
     * \param window      symbols, ≥ 1
     * \param confidence  of the intervals, inside (0, 1)
     * \param symbol_rate in Hz; 0 where unknown
     * \param decisions   `own` (nearest point, or MAP where priors differ) or `receiver` (a third input)
     * \param target      of the verdict: "ser:1e-3", "ber:1e-5", "fer:1e-2"; empty: no verdict
     * \param frame_symbols  symbols of a frame, from the first judged one on, at most 2^32; 0: no frames
     * \param max_excluded   share of symbols (frames) left out beyond which nothing passes, in 0 … 1
     * \param resume      log of an earlier run that goes on here: totals, gauge, shortfall, verdict …
     *                    (what its `link_log` left as path.carry); where there is no log a run begins
     * \param explain     gather what losses and premises are made of
     * \throws std::invalid_argument naming parameter and value, or what differs from the earlier run
     */
    static sptr make(const ::halfplane::signal_set& set,
                     const std::string& pattern,
                     std::uint64_t window = 10000,
                     double confidence = 0.95,
                     double symbol_rate = 0,
                     const std::string& decisions = "own",
                     const std::string& target = "",
                     std::uint64_t frame_symbols = 0,
                     double max_excluded = 1e-3,
                     const std::string& resume = "",
                     bool explain = true);

    /// The latest report as JSON text; empty before the first. The final one after top_block.wait().
    virtual std::string report() const = 0;
};

} // namespace gr::halfplane
