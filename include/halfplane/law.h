// SPDX-License-Identifier: GPL-3.0-or-later
// law: the tail of a channel law, the only thing that distinguishes one channel from another.
#pragma once

#include <memory>
#include <string>
#include <vector>

namespace halfplane {

/// One of finitely many states of a channel: its probability and its power gain (linear, > 0).
struct channel_state {
    double probability;
    double gain;
};

/*!
 * The law of the random power gain G ≥ 0 of a channel, given as its tail T(u) = E[exp(−G·u)]: what is left,
 * on average, of the Gaussian factor exp(−r²/N0) at u = r²/N0. The detector knows the gain and decides by it,
 * so under equal priors its decision cells stay where they are (Simon and Alouini, Digital Communication over
 * Fading Channels, 2nd ed. 2005, chapter 5: the moment-generating-function approach).
 *
 * To add a law, derive a class, give it name() and tail(), and a line in parse_law(). ln_tail() is worth
 * giving where the tail can fall below the smallest double; density() where unequal priors shall work too;
 * states() instead of density() where the gain takes finitely many values.
 */
class law
{
public:
    virtual ~law() = default;

    /// As the command line writes it: "awgn", "rician:6".
    virtual std::string name() const = 0;

    /// T(u) at u ≥ 0: T(0) = 1, falls with u, never negative.
    virtual double tail(double u) const = 0;

    /// ln T(u). The default takes the logarithm of tail().
    virtual double ln_tail(double u) const;

    /*!
     * Probability density of the gain of `branches` independent branches added up, at g > 0. Needed for MAP
     * decisions under unequal priors only, where the thresholds move with the gain.
     * \throws std::logic_error by default, naming the law
     */
    virtual double density(double g, unsigned branches) const;

    /// The states where the gain takes finitely many values, by falling probability; empty otherwise.
    virtual const std::vector<channel_state> &states() const;

    /*!
     * Why MAP decisions under unequal priors cannot be analysed under this law, or an empty string where they
     * can.
     */
    virtual std::string map_refusal() const { return {}; }
};

/// No fading: G = 1, T(u) = exp(−u).
class awgn final : public law
{
public:
    std::string name() const override { return "awgn"; }
    double tail(double u) const override;
    double ln_tail(double u) const override { return -u; }
    const std::vector<channel_state> &states() const override;
};

/// A law from what a user writes (`awgn`, …). \throws std::invalid_argument naming what is not understood
std::shared_ptr<const law> parse_law(const std::string &text);

} // namespace halfplane
