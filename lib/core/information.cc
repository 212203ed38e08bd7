// SPDX-License-Identifier: GPL-3.0-or-later
// information: from entropies of the received point to mutual information, along each axis where that is
// enough.
#include "halfplane/information.h"

#include "information_grid.h"
#include "refusal.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <stdexcept>

namespace halfplane {

namespace {

constexpr double log2_e = 1.4426950408889634074;

/// One axis of a grid: its levels, their probabilities, and the bits that they decide.
struct axis {
    std::vector<double> levels, priors;
    std::vector<label_t> labels;
    unsigned bits = 0;
};

/*!
 * A set that is the product of two sets on the line, priors and labels too, carries the sum of what they
 * carry: Gray QAM in two cheap integrals.
 */
std::optional<std::pair<axis, axis>> as_product(const signal_set& set)
{
    std::map<double, std::size_t> of_i, of_q;
    for (const auto& s : set.points()) {
        of_i.emplace(s.real(), 0);
        of_q.emplace(s.imag(), 0);
    }
    const std::size_t columns = of_i.size(), rows = of_q.size();
    if (columns * rows != set.size())
        return std::nullopt;
    axis a, b;
    for (auto* side : {&a, &b}) {
        auto& places = side == &a ? of_i : of_q;
        for (auto& [level, place] : places) {
            place = side->levels.size();
            side->levels.push_back(level);
        }
        side->priors.assign(side->levels.size(), 0);
        side->labels.assign(side->levels.size(), 0);
    }
    std::vector<std::size_t> column(set.size()), row(set.size());
    for (std::size_t k = 0; k < set.size(); ++k) {
        column[k] = of_i[set.points()[k].real()];
        row[k] = of_q[set.points()[k].imag()];
        a.priors[column[k]] += set.priors()[k];
        b.priors[row[k]] += set.priors()[k];
    }
    for (std::size_t k = 0; k < set.size(); ++k)
        if (std::abs(a.priors[column[k]] * b.priors[row[k]] / set.priors()[k] - 1) > 1e-13)
            return std::nullopt;

    for (unsigned bit = 0; bit < set.label_bits(); ++bit) {
        bool taken = false;
        for (auto* side : {&a, &b}) {
            const auto& place = side == &a ? column : row;
            std::vector<int> value(side->levels.size(), -1);
            bool decides = !taken;
            for (std::size_t k = 0; k < set.size() && decides; ++k) {
                const int b_k = set.labels()[k] >> bit & 1;
                decides = value[place[k]] < 0 || value[place[k]] == b_k;
                value[place[k]] = b_k;
            }
            if (!decides)
                continue;
            taken = true;
            for (std::size_t l = 0; l < value.size(); ++l)
                side->labels[l] = static_cast<label_t>(side->labels[l] | value[l] << side->bits);
            ++side->bits;
        }
        if (!taken)
            return std::nullopt;
    }
    return std::pair{std::move(a), std::move(b)};
}

double binary_entropy(double p)
{
    return p <= 0 || p >= 1 ? 0 : -p * std::log2(p) - (1 - p) * std::log1p(-p) * log2_e;
}

/// Σ_k H(B_k) by the priors.
double label_entropies(const signal_set& set)
{
    double sum = 0;
    for (unsigned bit = 0; bit < set.label_bits(); ++bit) {
        double ones = 0;
        for (std::size_t k = 0; k < set.size(); ++k)
            ones += set.labels()[k] >> bit & 1 ? set.priors()[k] : 0;
        sum += binary_entropy(ones);
    }
    return sum;
}

/*!
 * True where the points are so far apart in units of √N0 that nothing is lost: H(X|Y) is at most
 * log2(e) · Σ_{i≠j} √(p_i p_j) · exp(−d_ij²/4), and no more than 6·M pairs lie at a distance near d_min.
 */
bool nothing_lost(const signal_set& set, double d_min)
{
    return 6 * static_cast<double>(set.size()) * std::exp(-d_min * d_min / 4) < 1e-13;
}

} // namespace

information information_at(const signal_set& set, double es_n0)
{
    if (!(es_n0 >= 0))
        detail::refuse<std::invalid_argument>("es_n0 must be 0 or more, got ", es_n0);
    const double h = set.entropy_bits();
    if (es_n0 == 0)
        return {0, h - label_entropies(set)};
    const double scale = std::sqrt(es_n0) / std::sqrt(set.es()); // to √N0 = 1
    if (nothing_lost(set, set.d_min() * scale))
        return {h, h};

    const complex mean = set.mean(); // information does not depend on it, rounding does

    const double noise = std::log2(std::acos(-1.0)) + log2_e; // h of CN(0, 1): log2(π·e)
    double mi, unknown = 0;                                   // Σ_k H(B_k|Y)
    if (const auto product = as_product(set)) {
        mi = -noise;
        for (const axis* side : {&product->first, &product->second}) {
            auto levels = side->levels;
            for (double& x : levels)
                x = (x - (side == &product->first ? mean.real() : mean.imag())) * scale;
            const auto e = detail::line_entropies(levels, side->priors, side->labels, side->bits);
            mi += e.all;
            for (double joint : e.by_bit)
                unknown += joint - e.all;
        }
    } else {
        auto points = set.points();
        for (auto& s : points)
            s = (s - mean) * scale;
        const auto e = detail::plane_entropies(points, set.priors(), set.labels(), set.label_bits());
        mi = e.all - noise;
        for (double joint : e.by_bit)
            unknown += joint - e.all;
    }
    return {std::clamp(mi, 0.0, h), h - unknown};
}

std::optional<double> es_n0_for_information(const signal_set& set, double bits)
{
    if (!(bits > 0))
        detail::refuse<std::invalid_argument>("bits must be above 0, got ", bits);
    if (bits >= set.entropy_bits())
        return std::nullopt;
    // I(X;Y) rises with Es/N0 and never exceeds the capacity.
    double low = std::log(es_n0_of_capacity(bits)), high = low + 0.25;
    while (information_at(set, std::exp(high)).mi < bits) {
        low = high;
        high += 0.25;
        if (high > 2000)
            return std::nullopt;
    }
    for (int k = 0; k < 45 && high - low > 1e-11; ++k) {
        const double middle = (low + high) / 2;
        (information_at(set, std::exp(middle)).mi < bits ? low : high) = middle;
    }
    return std::exp((low + high) / 2);
}

double capacity(double es_n0)
{
    if (!(es_n0 >= 0))
        detail::refuse<std::invalid_argument>("es_n0 must be 0 or more, got ", es_n0);
    return std::log1p(es_n0) * log2_e;
}

double es_n0_of_capacity(double bits)
{
    if (!(bits >= 0))
        detail::refuse<std::invalid_argument>("bits must be 0 or more, got ", bits);
    return std::expm1(bits / log2_e);
}

double capacity_gap_db(double es_n0, double bits)
{
    if (!(es_n0 > 0 && std::isfinite(es_n0)))
        detail::refuse<std::invalid_argument>("es_n0 must be finite and above 0, got ", es_n0);
    if (!(bits > 0))
        detail::refuse<std::invalid_argument>("bits must be above 0, got ", bits);
    return 10 * std::log10(es_n0 / es_n0_of_capacity(bits));
}

double shannon_gap_db(const signal_set& set, double es_n0)
{
    return capacity_gap_db(es_n0, set.entropy_bits());
}

} // namespace halfplane
