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

    /// The states where the gain takes finitely many values, the likeliest first; empty otherwise.
    virtual const std::vector<channel_state>& states() const;

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
    const std::vector<channel_state>& states() const override;
};

/*!
 * Nakagami-m amplitude: G is gamma distributed with shape m and mean 1, T(u) = (1 + u/m)^−m
 * (Simon and Alouini 2005, table 2.2).
 */
class nakagami : public law
{
public:
    static constexpr double least_m = 0.5, greatest_m = 1e9;

    /// \throws std::invalid_argument unless 0.5 ≤ m ≤ 1e9
    explicit nakagami(double m);
    std::string name() const override;
    double tail(double u) const override;
    double ln_tail(double u) const override;
    double density(double g, unsigned branches) const override;

private:
    double d_m;
};

/// Rayleigh amplitude: G is exponential with mean 1, T(u) = 1/(1 + u).
class rayleigh final : public nakagami
{
public:
    rayleigh() : nakagami(1) {}
    std::string name() const override { return "rayleigh"; }
};

/*!
 * Rician amplitude: a steady path K times as strong as the scattered ones,
 * T(u) = (1 + K)/(1 + K + u)·exp(−K·u/(1 + K + u)) (Simon and Alouini 2005, table 2.2, K = n²).
 */
class rician final : public law
{
public:
    static constexpr double greatest_k_db = 100; ///< either sign

    /// \param k_db K in dB. \throws std::invalid_argument unless −100 ≤ k_db ≤ 100
    explicit rician(double k_db);
    std::string name() const override;
    double tail(double u) const override;
    double ln_tail(double u) const override;
    double density(double g, unsigned branches) const override;

private:
    double d_k_db, d_k;
};

/*!
 * A user's own finite mixture: the channel is in state s with probability p_s, gains relative to the stated
 * Es/N0, and the detector knows which. T(u) = Σ p_s·exp(−g_s·u).
 */
class mixture : public law
{
public:
    /// \throws std::invalid_argument unless probabilities are positive and sum to 1 within 1e-9, gains
    /// positive
    explicit mixture(std::vector<channel_state> states, std::string name = "mixture");
    std::string name() const override { return d_name; }
    double tail(double u) const override;
    double ln_tail(double u) const override;
    const std::vector<channel_state>& states() const override { return d_states; }

private:
    std::vector<channel_state> d_states;
    std::string d_name;
};

/*!
 * Impulsive noise, class A of Middleton (IEEE Trans. Electromagn. Compat. 19 (1977) 106): the noise power is
 * σ_k² = (k/A + Γ)/(1 + Γ) times its mean with probability exp(−A)·A^k/k!. N0 is the total; the detector does
 * not know k and decides by the nearest point, which equal priors make right.
 */
class impulsive final : public mixture
{
public:
    /*!
     * \param a     overlap index A, 1e-4 … 100
     * \param gamma power of the background over that of the impulses, 1e-9 … 1e9
     * \throws std::invalid_argument outside these ranges
     */
    impulsive(double a, double gamma);
    std::string map_refusal() const override;
};

/*!
 * L independent branches of one law, combined for the largest ratio: gains add up, T_L = T^L. Es/N0 is the
 * mean of one branch.
 */
class diversity final : public law
{
public:
    static constexpr unsigned greatest_branches = 64;

    /// \throws std::invalid_argument unless 1 ≤ branches ≤ 64, or where branch is impulsive
    diversity(std::shared_ptr<const law> branch, unsigned branches);
    std::string name() const override;
    double tail(double u) const override;
    double ln_tail(double u) const override;
    double density(double g, unsigned branches) const override;
    const std::vector<channel_state>& states() const override { return d_states; }

private:
    std::shared_ptr<const law> d_branch;
    unsigned d_branches;
    std::vector<channel_state> d_states;
};

/*!
 * A law from what a user writes: `awgn`, `rayleigh`, `rician:K_DB`, `nakagami:M`, `impulsive:A:GAMMA`, any
 * but the last with `*L` for L branches. \throws std::invalid_argument naming what is not understood
 */
std::shared_ptr<const law> parse_law(const std::string& text);

} // namespace halfplane
