// SPDX-License-Identifier: GPL-3.0-or-later
// scene: signed sums of wedges over edges (SER), walls (BER) and whole lines (the bounds).
#include "scene.h"

#include "bit_classes.h"
#include "scaled_wedge.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <numeric>

namespace halfplane {

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

/// The smallest distance at which anything goes wrong: sets the scale.
double least_squared_distance(const scene& s)
{
    double least = inf;
    for (const auto& a : s.arrivals) {
        if (a.owner != a.sent)
            return 0;
        for (auto k = s.regions->begin_of(a.sent); k != s.regions->end_of(a.sent); ++k)
            least = std::min(least, squared_approach(s.regions->edges()[*k].seen_from(a.mean)));
    }
    return std::isfinite(least) ? least : 0;
}

/// Sum over the edges of cell j of wedges, + where the mean lies on the inner side of the edge.
double mass_across(const scene& s, const scaled_wedge& w, std::size_t j, complex mean)
{
    double sum = 0;
    for (auto k = s.regions->begin_of(j); k != s.regions->end_of(j); ++k) {
        const auto& e = s.regions->edges()[*k];
        const auto v = e.seen_from(mean);
        sum += (v.height >= 0) == (e.inner == j) ? w(v) : -w(v);
    }
    return sum;
}

void exact_ser(const scene& s, const scaled_wedge& w, rate_sums& out)
{
    out.by_point.assign(s.set->size(), 0);
    std::vector<double> sent_weight(s.set->size(), 0);
    if (s.undisplaced && s.repeated) {
        // Both sides see an edge alike, and so do many edges of a grid.
        std::vector<double> p;
        for (const auto& c : s.repeated->edge_classes) {
            p.push_back(w(c.look));
            out.exact.ser += c.weight * p.back();
        }
        for (std::size_t k = 0; k < s.regions->edges().size(); ++k) {
            const auto& e = s.regions->edges()[k];
            out.by_point[e.inner] += p[s.repeated->class_of_edge[k]];
            out.by_point[e.outer] += p[s.repeated->class_of_edge[k]];
        }
        return;
    }
    for (const auto& a : s.arrivals) {
        const double p = (a.owner == a.sent ? 0 : w.one()) + mass_across(s, w, a.sent, a.mean);
        out.by_point[a.sent] += a.weight * p;
        sent_weight[a.sent] += a.weight;
        out.exact.ser += a.weight * p;
    }
    for (std::size_t i = 0; i < s.set->size(); ++i)
        if (sent_weight[i] > 0)
            out.by_point[i] /= sent_weight[i];
}

/// Adds one arrival's wrong bits to by_bit (leftmost first), walls beyond `reach` left out.
void add_wrong_bits(
    const scene& s, wedge_memory& w, double one, const arrival& a, double reach, std::vector<double>& by_bit)
{
    const auto bits = static_cast<unsigned>(by_bit.size());
    const label_t sent = s.set->labels()[a.sent];
    const label_t wrong_at_mean = sent ^ s.set->labels()[a.owner];
    double sum[signal_set::max_label_bits];
    for (unsigned k = 0; k < bits; ++k)
        sum[k] = (wrong_at_mean >> k & 1) ? one : 0;
    for (const auto& block : s.walls->blocks) {
        const double far = reach + block.radius;
        if (std::norm(block.centre - a.mean) > far * far)
            continue;
        for (auto n = block.first; n < block.last; ++n) {
            const wall& border = s.walls->walls[n];
            const auto v = border.line.seen_from(a.mean);
            if (squared_approach(v) > reach * reach)
                continue;
            const double p = w(v);
            // Bits that read right on the near side go wrong beyond the wall, the others come right.
            const label_t wrong_near = border.wrong_on_near_side(v, sent);
            for (unsigned left = border.mask; left != 0; left &= left - 1) {
                const auto k = static_cast<unsigned>(__builtin_ctz(left));
                sum[k] += (wrong_near >> k & 1) ? -p : p;
            }
        }
    }
    for (unsigned k = 0; k < bits; ++k)
        by_bit[bits - 1 - k] += a.weight * sum[k];
}

void exact_ber(const scene& s, const scaled_wedge& w, rate_sums& out)
{
    const unsigned bits = s.set->label_bits();
    if (s.undisplaced && s.repeated) {
        if (const auto& classes = s.repeated->bits(s)) {
            out.by_bit = classes->wrong_bits(w);
            out.exact.ber = std::accumulate(out.by_bit.begin(), out.by_bit.end(), 0.0) / bits;
            return;
        }
    }
    // A wall farther than R adds at most half the tail there. R is guessed from where each bit changes first
    // and moved out until what all walls beyond could add is nothing to any bit's rate.
    constexpr double negligible = 1e-14;
    constexpr double nothing = -700;
    const double ln_share =
        std::log(2 * negligible / static_cast<double>(std::max<std::size_t>(1, s.walls->walls.size())));
    double ln_cut = 0;
    for (const double d : s.walls->approach)
        if (std::isfinite(d))
            ln_cut = std::min(ln_cut, w.relative_ln_tail(d));
    ln_cut += ln_share - 5;
    wedge_memory memory(w, s.walls->walls.size());
    for (bool enough = false; !enough;) {
        const double reach = ln_cut > nothing ? w.distance_at(ln_cut) : inf;
        out.by_bit.assign(bits, 0);
        for (const auto& a : s.arrivals)
            add_wrong_bits(s, memory, w.one(), a, reach, out.by_bit);
        enough = true;
        for (const double p : out.by_bit) {
            const double needed = p > 0 ? std::log(p) + ln_share : nothing;
            if (std::isfinite(reach) && needed < ln_cut) {
                ln_cut = needed - 1;
                enough = false;
            }
        }
    }
    out.exact.ber = 0;
    for (const double p : out.by_bit)
        out.exact.ber += p / bits;
}

/// Probability that i sent looks less likely than j, in scaled units.
double pairwise(const scene& s, const scaled_wedge& w, std::size_t i, std::size_t j)
{
    const complex apart = s.set->points()[j] - s.set->points()[i];
    const double d = std::abs(apart);
    double h = d / 2;
    if (!s.weights.empty())
        h += (s.weights[i] - s.weights[j]) / (2 * d);
    if (s.whiten) { // the line's distance after the map: divided by the length of the mapped normal
        const auto& a = *s.whiten;
        const complex n = apart / d;
        h *= std::abs(a[0] * a[3] - a[1] * a[2]) /
             std::hypot(a[3] * n.real() - a[2] * n.imag(), a[0] * n.imag() - a[1] * n.real());
    }
    return w.half_plane(h);
}

void add_pair(const scene& s, const scaled_wedge& w, std::size_t i, std::size_t j, ser_ber& sum)
{
    const auto& prior = s.set->priors();
    const double p = s.weights.empty() && !s.whiten
                         ? (prior[i] + prior[j]) * pairwise(s, w, i, j)
                         : prior[i] * pairwise(s, w, i, j) + prior[j] * pairwise(s, w, j, i);
    sum.ser += p;
    sum.ber += p * label_distance(s.set->labels()[i], s.set->labels()[j]) / s.set->label_bits();
}

void facing_sum(const scene& s, const scaled_wedge& w, ser_ber& sum)
{
    for (const auto& e : s.regions->edges())
        add_pair(s, w, e.inner, e.outer, sum);
    for (std::size_t i = 0; i < s.set->size(); ++i) {
        if (!s.regions->empty(i))
            continue;
        for (std::size_t j = 0; j < s.set->size(); ++j) {
            if (j == i)
                continue;
            const double p = s.set->priors()[i] * pairwise(s, w, i, j);
            sum.ser += p;
            sum.ber += p * label_distance(s.set->labels()[i], s.set->labels()[j]) / s.set->label_bits();
        }
    }
}

void class_sum(const std::vector<pair_class>& classes, const scaled_wedge& w, ser_ber& sum)
{
    for (const auto& c : classes) {
        const double p = w.half_plane(c.distance / 2);
        sum.ser += c.ser_weight * p;
        sum.ber += c.ber_weight * p;
    }
}

void union_sum(const scene& s, const scaled_wedge& w, ser_ber& sum)
{
    // With one prior for all and thresholds half way, pairs whose tail is exp(−60) of the nearest are
    // nothing: there are fewer than exp(16) of them, and no pair weighs more than another by more than its
    // bits.
    const bool cull = s.weights.empty() && !s.whiten && s.set->uniform();
    const double far = cull ? 2 * w.distance_at(-60) : inf;
    for (std::size_t i = 0; i < s.set->size(); ++i)
        for (std::size_t j = i + 1; j < s.set->size(); ++j)
            if (!cull || std::norm(s.set->points()[i] - s.set->points()[j]) < far * far)
                add_pair(s, w, i, j, sum);
}

} // namespace

rate_sums evaluate(const scene& s, const noise& n, unsigned parts)
{
    const scaled_wedge w(n, least_squared_distance(s));
    rate_sums out;
    out.ln_scale = w.ln_scale();
    if (parts & part_exact_ser)
        exact_ser(s, w, out);
    if (parts & part_exact_ber)
        exact_ber(s, w, out);
    if (parts & part_facing) {
        if (s.repeated)
            class_sum(s.repeated->facing, w, out.facing);
        else
            facing_sum(s, w, out.facing);
    }
    if (parts & part_nearest) {
        if (s.repeated)
            class_sum(s.repeated->nearest, w, out.nearest);
        else
            for (const auto& [i, j] : closest_pairs(*s.set))
                add_pair(s, w, i, j, out.nearest);
    }
    if (parts & part_union) {
        if (s.repeated && s.repeated->all(*s.set))
            class_sum(*s.repeated->all(*s.set), w, out.union_bound);
        else
            union_sum(s, w, out.union_bound);
    }
    return out;
}

const std::optional<std::vector<pair_class>>& repetitions::all(const signal_set& set) const
{
    std::call_once(d_once, [&] { d_all = classes_of_all(set); });
    return d_all;
}

const std::optional<bit_classes>& repetitions::bits(const scene& undisplaced) const
{
    std::call_once(d_bits_once, [&] { d_bits = bit_classes::of(undisplaced); });
    return d_bits;
}

std::unique_ptr<repetitions> find_repetitions(const signal_set& set, const cells& regions)
{
    auto out = std::make_unique<repetitions>();
    index_pairs facing;
    std::map<std::array<double, 3>, std::uint32_t> known;
    for (const auto& e : regions.edges()) {
        facing.emplace_back(e.inner, e.outer);
        edge_view look{e.offset, e.from, e.to};
        if (look.from + look.to < 0) // mirrored, it looks the same
            look = {e.offset, -e.to, -e.from};
        const auto next = static_cast<std::uint32_t>(out->edge_classes.size());
        const auto place = known.emplace(std::array<double, 3>{look.height, look.from, look.to}, next).first;
        if (place->second == next)
            out->edge_classes.push_back({look, 0});
        out->edge_classes[place->second].weight += set.priors()[e.inner] + set.priors()[e.outer];
        out->class_of_edge.push_back(place->second);
    }
    out->facing = classes_of(set, facing);
    out->nearest = classes_of(set, closest_pairs(set));
    return out;
}

std::vector<double> transition_masses(const scene& s, const noise& n, const std::vector<arrival>& from)
{
    const scaled_wedge w(n, 0);
    wedge_memory memory(w, s.regions->edges().size());
    const std::size_t m = s.set->size();
    std::vector<double> out(from.size() * m, 0);
    for (std::size_t row = 0; row < from.size(); ++row) {
        double* p = out.data() + row * m;
        for (const auto& e : s.regions->edges()) {
            const auto v = e.seen_from(from[row].mean);
            const double mass = v.height >= 0 ? memory(v) : -memory(v);
            p[e.inner] -= mass;
            p[e.outer] += mass;
        }
        p[from[row].owner] += 1;
    }
    for (double& x : out)
        x = std::max(x, 0.0);
    return out;
}

} // namespace halfplane
