// SPDX-License-Identifier: GPL-3.0-or-later
// explanation: losses and premises of the run so far, made anew as the run grows.
#pragma once

#include "halfplane/link/watch.h"
#include "halfplane/losses.h"
#include "halfplane/premises.h"

namespace halfplane::link {

/*!
 * Averages over neighbours take tens of milliseconds, so the answer is kept until the symbols behind it have
 * grown by a tenth: the work of a whole run grows with the logarithm of its length.
 */
class explanation
{
public:
    void add(const residual_sums& of_window) { d_sums.merge(of_window); }
    /// See carry.h.
    template <typename Archive>
    void carry(Archive& a)
    {
        a("sums", d_sums);
    }
    /// Makes losses and premises where they are due; `last`: in any case.
    void refresh(const predictor& p, const ser_curve& curve, const loss_question& asked, bool last);

    std::uint64_t symbols() const { return d_symbols; } ///< explained symbols behind the rows
    const std::vector<loss>& losses() const { return d_losses; }
    const std::vector<premise>& premises() const { return d_premises; }

private:
    residual_sums d_sums;
    std::uint64_t d_symbols = 0;
    std::vector<loss> d_losses;
    std::vector<premise> d_premises;
};

} // namespace halfplane::link
