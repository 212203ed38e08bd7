// SPDX-License-Identifier: GPL-3.0-or-later
// required_es_n0: the inverse of the rungs, Es/N0 for a target rate.
#include "halfplane/rates.h"

#include <boost/math/tools/roots.hpp>

#include <cmath>
#include <functional>
#include <sstream>
#include <stdexcept>

namespace halfplane {

namespace {

constexpr double lowest_db = -60, highest_db = 200;

/*!
 * The largest x in [lowest_db, highest_db] at which f crosses from above ln_target to below it.
 * \param safe_db beyond it f is known to stay below the target
 */
std::optional<double>
largest_crossing(const std::function<double(double)>& f, double ln_target, double safe_db)
{
    constexpr double step = 0.25;
    double high = safe_db, low = high;
    do {
        high = low;
        if (high <= lowest_db)
            return std::nullopt;
        low = std::max(lowest_db, high - step);
    } while (f(low) <= ln_target);
    std::uintmax_t rounds = 200;
    const auto root = boost::math::tools::toms748_solve(
        [&](double x) { return f(x) - ln_target; },
        low,
        high,
        [](double a, double b) { return std::abs(a - b) <= 1e-13 * std::max(1.0, std::abs(a)); },
        rounds);
    return from_db(root.second);
}

/// Smallest x, to a coarse grid, beyond which a falling function stays at or below ln_target.
std::optional<double> bracket_falling(const std::function<double(double)>& f, double ln_target)
{
    if (!(f(highest_db) <= ln_target))
        return std::nullopt;
    double low = lowest_db, high = highest_db;
    while (high - low > 0.125) {
        const double middle = 0.5 * (low + high);
        (f(middle) <= ln_target ? high : low) = middle;
    }
    return high;
}

void require_target(double target)
{
    if (target > 0 && std::isfinite(target))
        return;
    std::ostringstream text;
    text << "a target rate must be a finite number above 0, got " << target;
    throw std::invalid_argument(text.str());
}

} // namespace

std::optional<double> predictor::es_n0_for_ser(double target, rung_name r) const
{
    require_target(target);
    const double ln_target = std::log(target);
    const auto f = [&](double db) { return ln_ser(from_db(db), r); };
    const auto safe = bracket_falling(f, ln_target);
    return safe ? largest_crossing(f, ln_target, *safe) : std::nullopt;
}

std::optional<double> predictor::es_n0_for_ber(double target, rung_name r) const
{
    require_target(target);
    const double ln_target = std::log(target);
    const auto f = [&](double db) { return ln_ber(from_db(db), r); };
    // The exact BER may rise on its way down, but never exceeds the SER, which does not.
    const auto falling = [&](double db) {
        return r == rung_name::exact ? ln_ser(from_db(db), r) : ln_ber(from_db(db), r);
    };
    const auto safe = bracket_falling(falling, ln_target);
    return safe ? largest_crossing(f, ln_target, *safe) : std::nullopt;
}

namespace {

/// Central difference of f at x, extrapolated once (Richardson): the error falls with the fourth power.
double slope(const std::function<double(double)>& f, double x)
{
    constexpr double step = 0.02;
    const double wide = (f(x + step) - f(x - step)) / (2 * step);
    const double fine = (f(x + step / 2) - f(x - step / 2)) / step;
    return fine + (fine - wide) / 3;
}

constexpr double ln_10 = 2.302585092994045684;

} // namespace

double predictor::ser_decades_per_db(double es_n0, rung_name r) const
{
    return slope([&](double db) { return ln_ser(from_db(db), r) / ln_10; }, to_db(es_n0));
}

double predictor::ber_decades_per_db(double es_n0, rung_name r) const
{
    return slope([&](double db) { return ln_ber(from_db(db), r) / ln_10; }, to_db(es_n0));
}

} // namespace halfplane
