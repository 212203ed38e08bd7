// SPDX-License-Identifier: GPL-3.0-or-later
// rate_sums: adding scaled sums and turning them into rates.
#include "rate_sums.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace halfplane {

namespace {

void add_scaled(ser_ber& sum, double old_factor, const ser_ber& other, double factor)
{
    sum.ser = sum.ser * old_factor + other.ser * factor;
    sum.ber = sum.ber * old_factor + other.ber * factor;
}

void add_scaled(std::vector<double>& sum, double old_factor, const std::vector<double>& other, double factor)
{
    sum.resize(other.size());
    for (std::size_t k = 0; k < sum.size(); ++k)
        sum[k] = sum[k] * old_factor + other[k] * factor;
}

/// x·exp(ln_scale) where exp() alone may underflow although the product does not, or the other way round.
double unscaled(double x, double ln_scale)
{
    if (ln_scale > -700)
        return x * std::exp(ln_scale);
    return x > 0 ? std::exp(std::log(x) + ln_scale) : 0;
}

void fill(rung& out, const ser_ber& sum, double ln_scale, unsigned label_bits)
{
    out.ser = unscaled(sum.ser, ln_scale);
    out.ber = unscaled(sum.ber, ln_scale);
    out.ln_ser = std::log(sum.ser) + ln_scale;
    out.ln_ber = std::log(sum.ber) + ln_scale;
    out.ber_if_gray = out.ser / label_bits;
}

} // namespace

const ser_ber& rate_sums::of(rung_name r) const
{
    switch (r) {
    case rung_name::exact:
        return exact;
    case rung_name::facing:
        return facing;
    case rung_name::union_bound:
        return union_bound;
    default:
        return nearest;
    }
}

double rate_sums::magnitude() const
{
    double sum = 0;
    for (const auto* r : {&exact, &facing, &union_bound, &nearest})
        sum += std::abs(r->ser) + std::abs(r->ber);
    return sum;
}

bool rate_sums::negligible_beside(const rate_sums& sum, double share) const
{
    const double factor = std::exp(std::min(700.0, ln_scale - sum.ln_scale));
    for (const auto r : {&rate_sums::exact, &rate_sums::facing, &rate_sums::union_bound, &rate_sums::nearest})
        if ((this->*r).ser * factor > share * (sum.*r).ser || (this->*r).ber * factor > share * (sum.*r).ber)
            return false;
    return true;
}

rate_sums rate_sums::absolute() const
{
    rate_sums out = *this;
    for (auto* r : {&out.exact, &out.facing, &out.union_bound, &out.nearest})
        *r = {std::abs(r->ser), std::abs(r->ber)};
    return out;
}

double rate_sums::least() const
{
    double smallest = std::numeric_limits<double>::infinity();
    const auto consider = [&](double x) {
        if (x > 0)
            smallest = std::min(smallest, x);
    };
    for (const auto* r : {&exact, &facing, &union_bound, &nearest}) {
        consider(r->ser);
        consider(r->ber);
    }
    std::for_each(by_point.begin(), by_point.end(), consider);
    std::for_each(by_bit.begin(), by_bit.end(), consider);
    return smallest;
}

void rate_sums::add(double weight, const rate_sums& other)
{
    const bool first = magnitude() == 0;
    const double scale = first ? other.ln_scale : std::max(ln_scale, other.ln_scale);
    const double old_factor = first ? 0 : std::exp(ln_scale - scale);
    const double factor = weight * std::exp(other.ln_scale - scale);
    add_scaled(exact, old_factor, other.exact, factor);
    add_scaled(facing, old_factor, other.facing, factor);
    add_scaled(union_bound, old_factor, other.union_bound, factor);
    add_scaled(nearest, old_factor, other.nearest, factor);
    add_scaled(by_point, old_factor, other.by_point, factor);
    add_scaled(by_bit, old_factor, other.by_bit, factor);
    ln_scale = scale;
}

rates rate_sums::finish(unsigned label_bits) const
{
    rates out;
    fill(out.exact, exact, ln_scale, label_bits);
    fill(out.facing, facing, ln_scale, label_bits);
    fill(out.union_bound, union_bound, ln_scale, label_bits);
    fill(out.nearest, nearest, ln_scale, label_bits);
    out.exact.ser_by_point = by_point;
    out.exact.ber_by_bit = by_bit;
    for (double& p : out.exact.ser_by_point)
        p = unscaled(p, ln_scale);
    for (double& p : out.exact.ber_by_bit)
        p = unscaled(p, ln_scale);
    return out;
}

} // namespace halfplane
