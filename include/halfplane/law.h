// SPDX-License-Identifier: GPL-3.0-or-later
// law: the tail of a channel law, the only thing that distinguishes one channel from another.
#pragma once

#include <memory>
#include <string>

namespace halfplane {

/*!
 * T(u) = E[exp(−G·u)], G the random power gain of the channel with mean 1 a branch: the chance that noise of
 * unit energy crosses a line whose squared distance is u, before averaging over the angle. Perfect channel
 * knowledge at the detector.
 */
class law
{
public:
    virtual ~law() = default;
    /// Tail at u ≥ 0; T(0) = 1, falls with u, never negative.
    virtual double tail(double u) const = 0;
    /// As the command line writes it: "awgn", "rician:6".
    virtual std::string name() const = 0;
    /// True where the wedge of AWGN applies as it is (T(u) = exp(−u)).
    virtual bool is_awgn() const { return false; }
};

/// T(u) = exp(−u).
class awgn final : public law
{
public:
    double tail(double u) const override;
    std::string name() const override { return "awgn"; }
    bool is_awgn() const override { return true; }
};

/// A law from what a user writes (`awgn`, …). \throws std::invalid_argument naming what is not understood
std::shared_ptr<const law> parse_law(const std::string& text);

} // namespace halfplane
