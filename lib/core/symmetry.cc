// SPDX-License-Identifier: GPL-3.0-or-later
// symmetry: rotations and mirrors of a set about a centre, with the permutation each one makes.
#include "halfplane/geometry.h"

#include "refusal.h"
#include "tolerance.h"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <optional>

namespace halfplane {

namespace {

using permutation = std::vector<std::uint16_t>;

/// Points about the centre in units of d_min, and the search for the point nearest to a place.
class scene
{
public:
    scene(const signal_set& set, double tolerance, complex centre)
        : priors(set.priors()), tolerance(tolerance), d_order(set.size())
    {
        double farthest = 1;
        for (const auto& s : set.points()) {
            points.push_back((s - centre) / set.d_min());
            farthest = std::max(farthest, std::abs(points.back()));
        }
        slack = tolerance + 1e-14 * farthest;
        std::iota(d_order.begin(), d_order.end(), std::uint16_t{0});
        std::sort(d_order.begin(), d_order.end(), [&](auto a, auto b) {
            return points[a].real() < points[b].real();
        });
    }

    /// A quarter of d_min around a place there is one point at most.
    std::optional<std::uint16_t> nearest(complex place) const
    {
        auto k =
            std::lower_bound(d_order.begin(), d_order.end(), place.real() - reach, [&](auto a, double x) {
                return points[a].real() < x;
            });
        for (; k != d_order.end() && points[*k].real() <= place.real() + reach; ++k)
            if (std::abs(points[*k] - place) < reach)
                return *k;
        return std::nullopt;
    }

    /// Where the map sends every point, nothing where it does not send them onto points of equal priors.
    std::optional<permutation> match(complex turn, bool mirrored, double within) const
    {
        permutation to(points.size());
        std::vector<bool> taken(points.size());
        for (std::size_t i = 0; i < points.size(); ++i) {
            const complex image = turn * (mirrored ? std::conj(points[i]) : points[i]);
            const auto j = nearest(image);
            if (!j || taken[*j] || std::abs(points[*j] - image) > within)
                return std::nullopt;
            if (std::abs(priors[i] - priors[*j]) > tolerance * std::max(priors[i], priors[*j]))
                return std::nullopt;
            taken[*j] = true;
            to[i] = *j;
        }
        return to;
    }

    /*!
     * Points by distance from the centre; those that a symmetry may exchange are always in one class, since
     * their distances differ by slack at most. Within a quarter of d_min around the centre there is one point
     * at most; it is left out, since it may stay where it is.
     */
    std::vector<std::vector<std::uint16_t>> classes() const
    {
        std::vector<std::uint16_t> order(points.size());
        std::iota(order.begin(), order.end(), std::uint16_t{0});
        std::sort(order.begin(), order.end(), [&](auto a, auto b) {
            return std::abs(points[a]) < std::abs(points[b]);
        });
        std::vector<std::vector<std::uint16_t>> all;
        double last = -1;
        for (auto i : order) {
            const double radius = std::abs(points[i]);
            if (radius <= reach)
                continue;
            if (all.empty() || radius > last + slack)
                all.emplace_back();
            all.back().push_back(i);
            last = radius;
        }
        return all;
    }

    std::vector<complex> points;
    const std::vector<double>& priors;
    double tolerance;
    double slack; ///< the tolerance and what rounding adds to coordinates far from the centre

private:
    static constexpr double reach = 0.25;
    std::vector<std::uint16_t> d_order;
};

complex turn_by(double angle)
{
    return std::polar(1.0, angle);
}

double step_of(std::size_t rotations)
{
    return 4 * std::acos(0.0) / static_cast<double>(rotations);
}

/// The largest n for which a turn by 2π/n is a symmetry. Rotations move no point but the centre, so n divides
/// the size of every class.
std::size_t count_rotations(const scene& s, const std::vector<std::vector<std::uint16_t>>& classes)
{
    std::size_t common = 0;
    for (const auto& c : classes)
        common = std::gcd(common, c.size());
    for (std::size_t n = common; n > 1; --n)
        if (common % n == 0 && s.match(turn_by(step_of(n)), false, s.slack))
            return n;
    return 1;
}

/// The angle φ of some mirror z → exp(iφ)·conj(z), or nothing.
std::optional<double> find_mirror(const scene& s, const std::vector<std::vector<std::uint16_t>>& classes)
{
    // Every mirror carries a point into its own class: the smallest class leaves the fewest to try, and far
    // from the centre the angle is known best.
    const auto& least = *std::min_element(classes.begin(), classes.end(), [&](const auto& a, const auto& b) {
        return a.size() != b.size() ? a.size() < b.size()
                                    : std::abs(s.points[a[0]]) > std::abs(s.points[b[0]]);
    });
    for (auto q : least) {
        const auto rough = s.match(turn_by(std::arg(s.points[least[0]]) + std::arg(s.points[q])), true, 0.25);
        if (!rough)
            continue;
        complex sum = 0; // s_to(i)·s_i = exp(iφ)·|s_i|²
        for (std::size_t i = 0; i < s.points.size(); ++i)
            sum += s.points[(*rough)[i]] * s.points[i];
        if (s.match(turn_by(std::arg(sum)), true, s.slack))
            return std::arg(sum);
    }
    return std::nullopt;
}

struct group {
    std::size_t rotations;
    std::optional<double> mirror;
};

group find_group(const scene& s)
{
    const auto classes = s.classes();
    return {count_rotations(s, classes), find_mirror(s, classes)};
}

void check(double tolerance, complex centre)
{
    detail::require_tolerance(tolerance);
    if (!std::isfinite(centre.real()) || !std::isfinite(centre.imag()))
        detail::refuse<std::invalid_argument>(
            "centre must be finite, got (", centre.real(), ", ", centre.imag(), ")");
}

} // namespace

symmetry_count count_symmetries(const signal_set& set, double tolerance, complex centre)
{
    check(tolerance, centre);
    const auto found = find_group(scene(set, tolerance, centre));
    return {found.rotations, found.mirror ? found.rotations : 0};
}

std::vector<symmetry> symmetries(const signal_set& set, double tolerance, complex centre)
{
    check(tolerance, centre);
    const scene s(set, tolerance, centre);
    const auto found = find_group(s);
    const double step = step_of(found.rotations), whole = step_of(1);
    const auto one_step = *s.match(turn_by(found.rotations == 1 ? 0 : step), false, s.slack);

    // The powers of one turn, alone and after one mirror: exact permutations, whatever the rounding.
    std::vector<symmetry> all;
    const auto add_turns = [&](double angle, bool mirrored, permutation to) {
        for (std::size_t k = 0; k < found.rotations; ++k) {
            all.push_back({angle + static_cast<double>(k) * step, mirrored, centre, to});
            for (auto& i : to)
                i = one_step[i];
        }
    };
    permutation identity(set.size());
    std::iota(identity.begin(), identity.end(), std::uint16_t{0});
    add_turns(0, false, std::move(identity));
    if (found.mirror) {
        auto first = *s.match(turn_by(*found.mirror), true, s.slack);
        // Turned back to the mirror of least angle, which is 0 where it is so within rounding.
        const double any = std::fmod(*found.mirror + whole, whole);
        const auto back = static_cast<std::size_t>(any / step + 1e-9);
        const double angle = std::max(any - static_cast<double>(back) * step, 0.0);
        for (std::size_t k = 0; k < (found.rotations - back % found.rotations) % found.rotations; ++k)
            for (auto& i : first)
                i = one_step[i];
        add_turns(angle, true, std::move(first));
    }
    return all;
}

} // namespace halfplane
