// SPDX-License-Identifier: GPL-3.0-or-later
// losses: causes found in the sums, and what mending each would gain.
#include "halfplane/losses.h"

#include "impairment.h"
#include "intersymbol.h"

#include <boost/math/distributions/normal.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/math/tools/roots.hpp>

#include <algorithm>
#include <cmath>
#include <functional>

namespace halfplane {

namespace {

/// A cause that was found, its power over Es, and how the link looks without it.
struct finding {
    cause what;
    double power;
    std::function<void(impairment&)> mend;
};

double power(const neighbour_taps& taps)
{
    double sum = 0;
    for (const auto& t : taps)
        sum += std::norm(t);
    return sum;
}

void subtract(neighbour_taps& from, const neighbour_taps& part)
{
    for (std::size_t l = 0; l < part.size(); ++l)
        from[l] -= part[l];
}

class finder
{
public:
    finder(const signal_set& set,
           const residual_sums& sums,
           const residual_fit& fit,
           const loss_question& asked)
        : d_fit(fit), d_moments(sums.moments), d_asked(asked)
    {
        for (std::size_t i = 0; i < set.size(); ++i)
            d_kappa += set.priors()[i] * std::pow(std::norm(set.points()[i]) / set.es(), 2);
        d_gain = 1.0 + fit.value[column::gain];
        full.gain = d_left = d_gain;
        full.n0 = fit.n0;
        find_phase_noise();
        find_fixed();
        find_neighbours();
        full.n0 = noise_alone();
        find_gain();
        find_noise();
    }

    impairment full;
    std::vector<finding> found;
    /// Es/N0 of the noise alone, without any cause.
    double noise_es_n0() const { return std::norm(full.gain) / (full.n0 * d_taken); }

private:
    bool beyond_chance(double exponential) const { return std::exp(-exponential) < loss_significance; }

    /*!
     * A cause that multiplies the symbol's own gain by `factor`: the gain that remains without it lies
     * between that seen (a gain control turns back) and that divided by the factor (nothing does), as near to
     * 1 as it can. Returns how mending it changes gain and noise.
     */
    std::function<void(impairment&)> give_back(complex factor)
    {
        const complex step = d_left / factor - d_left;
        double share = 0;
        if (std::norm(step) > 0)
            share = std::clamp(std::real((1.0 - d_left) * std::conj(step)) / std::norm(step), 0.0, 1.0);
        const complex remaining = d_left + share * step, seen = d_left / remaining;
        d_left = remaining;
        d_taken *= std::norm(factor);
        return [seen, shrinks = std::norm(factor / seen)](impairment& link) {
            link.gain /= seen;
            link.n0 *= shrinks;
        };
    }

    /// The input brings no less noise than that: a loss of gain that would make it do so is not believed.
    double limited(double gain) const
    {
        if (!d_asked.input_es_n0_db)
            return gain;
        const double least = noise_es_n0() / from_db(*d_asked.input_es_n0_db);
        return std::clamp(std::sqrt(least), gain, 1.0);
    }

    void find_phase_noise()
    {
        const double excess = -d_moments.turned.real(), deviation = std::sqrt(d_moments.turned_norm / 2);
        const boost::math::normal gaussian;
        if (!(excess >
              boost::math::quantile(boost::math::complement(gaussian, loss_significance)) * deviation))
            return;
        const double share = std::min(excess / d_moments.signal_fourth, 0.9);
        const double variance = -std::log1p(-share), ratio = std::expm1(variance);
        full.phase_variance = variance;
        const auto back = give_back(std::exp(-variance / 2));
        found.push_back({cause::phase_noise, ratio, [back](impairment& link) {
                             link.phase_variance = 0;
                             back(link);
                         }});
    }

    void find_fixed()
    {
        const auto relative = [&](std::size_t c) { return d_fit.value[c] / d_gain; };
        if (beyond_chance(d_fit.strength(column::offset))) {
            full.offset = relative(column::offset);
            found.push_back(
                {cause::offset, std::norm(full.offset), [](impairment& link) { link.offset = 0; }});
        }
        if (beyond_chance(d_fit.strength(column::image))) {
            full.image = relative(column::image);
            // Imbalance behind the noise makes the noise oval too; ahead of it, it does not.
            const auto& m = d_moments;
            if (beyond_chance(std::norm(m.square) / m.fourth)) {
                const complex oval = m.square / m.power;
                full.noise_square = oval * std::min(1.0, 0.9 / std::abs(oval));
            }
            found.push_back({cause::iq_imbalance, std::norm(full.image), [](impairment& link) {
                                 link.image = 0;
                                 link.noise_square = 0;
                             }});
        }
        if (beyond_chance(d_fit.strength(column::compression))) {
            full.curve = relative(column::compression);
            const auto back = give_back(1.0 / (1.0 - full.curve * d_kappa));
            found.push_back({cause::compression,
                             std::norm(full.curve) * d_fit.column_power[column::compression],
                             [back](impairment& link) {
                                 link.curve = 0;
                                 back(link);
                             }});
        }
    }

    /// What is left of the gauge's N0, which knows all symbols but gain and offset only.
    double noise_alone() const
    {
        const double turned =
            full.phase_variance > 0 ? std::expm1(full.phase_variance) * d_fit.column_power[column::gain] : 0;
        const double fixed = std::norm(full.image) * d_fit.column_power[column::image] +
                             std::norm(full.curve) * d_fit.column_power[column::compression] +
                             power(full.taps) * d_fit.column_power[column::gain];
        const double signal = std::norm(d_gain), least = 0.02 * d_fit.n0;
        if (d_asked.gauged_n0)
            if (const double n0 = *d_asked.gauged_n0 - signal * (turned + fixed); n0 > least)
                return n0;
        return std::max(d_fit.n0 - signal * turned, least);
    }

    void find_neighbours()
    {
        neighbour_taps taps;
        std::array<double, 2 * column::reach> variance;
        for (std::size_t l = 0; l < taps.size(); ++l) {
            const std::size_t c = column::first_neighbour + l;
            taps[l] = d_fit.value[c] / d_gain;
            variance[l] = d_fit.known[c] ? d_fit.n0 * d_fit.inverse[c][c].real() / std::norm(d_gain)
                                         : 1; // says nothing
        }
        if (d_fit.neighbours == 0 || boost::math::gamma_q(static_cast<double>(d_fit.neighbours),
                                                          d_fit.neighbour_strength) >= loss_significance)
            return;
        full.taps = taps;
        const auto parts = split_taps(taps, variance);
        const auto add = [&](cause what, const neighbour_taps& part, double gain) {
            if (!(power(part) > 0))
                return;
            const auto back = give_back(gain);
            found.push_back({what, power(part), [part, back](impairment& link) {
                                 subtract(link.taps, part);
                                 back(link);
                             }});
        };
        add(cause::echo, parts.echo, 1);
        add(cause::timing, parts.timing, parts.timing_gain);
        add(cause::filter, parts.filter, limited(parts.filter_gain));
    }

    /// What no other cause answers for.
    void find_gain()
    {
        const double variance = d_fit.n0 * d_fit.inverse[column::gain][column::gain].real() / 2;
        const double size = std::abs(d_left), angle = std::arg(d_left);
        // z² of one dimension is beyond chance where the exponential of a complex one at z²/2 is, nearly.
        const auto rescale = [size](impairment& link) {
            link.gain /= size;
            link.n0 /= size * size;
        };
        const auto turn_back = [angle](impairment& link) { link.gain *= std::polar(1.0, -angle); };
        if (beyond_chance((size - 1) * (size - 1) / variance / 2))
            found.push_back({cause::gain_error, std::pow(1 - 1 / size, 2), rescale});
        else
            rescale(full);
        if (beyond_chance(angle * angle * size * size / variance / 2))
            found.push_back({cause::phase_error, 2 - 2 * std::cos(angle), turn_back});
        else
            turn_back(full);
    }

    void find_noise()
    {
        const double relative = full.n0 / std::norm(full.gain);
        const auto& m = d_moments;
        double foretold = 0;
        if (m.lag_one_norm > 0) {
            const double x = std::norm(m.lag_one) / m.lag_one_norm; // exponential where the noise is white
            if (beyond_chance(x))
                foretold = std::min(x / static_cast<double>(m.pairs), 0.99);
        }
        if (!d_asked.input_es_n0_db)
            return; // how much of the noise is the receiver's doing is unknown
        // Noise that the input brings is not, coloured or not.
        double excess = from_db(*d_asked.input_es_n0_db) / noise_es_n0();
        foretold = std::min(foretold, std::max(0.0, 1 - 1 / excess));
        if (foretold > 0)
            found.push_back({cause::coloured_noise, foretold * relative, [foretold](impairment& link) {
                                 link.n0 *= 1 - foretold;
                             }});
        excess *= 1 - foretold;
        found.push_back({cause::excess_noise,
                         relative * (1 - foretold) * (1 - 1 / excess),
                         [excess](impairment& link) { link.n0 /= excess; }});
    }

    const residual_fit& d_fit;
    const residual_moments& d_moments;
    const loss_question& d_asked;
    double d_kappa = 0;
    complex d_gain;
    complex d_left;     // of the gain, once causes have taken their part
    double d_taken = 1; // power that causes take of the gain
};

} // namespace

const char* to_string(cause c) noexcept
{
    switch (c) {
    case cause::gain_error:
        return "gain_error";
    case cause::phase_error:
        return "phase_error";
    case cause::offset:
        return "offset";
    case cause::iq_imbalance:
        return "iq_imbalance";
    case cause::compression:
        return "compression";
    case cause::echo:
        return "echo";
    case cause::timing:
        return "timing";
    case cause::filter:
        return "filter";
    case cause::phase_noise:
        return "phase_noise";
    case cause::coloured_noise:
        return "coloured_noise";
    case cause::excess_noise:
        return "excess_noise";
    case cause::interaction:
        return "interaction";
    case cause::unexplained:
        return "unexplained";
    }
    return "";
}

double es_n0_db_of(const ser_curve& curve, double ln_ser, double guess_db)
{
    const auto above = [&](double db) { return curve.at(db).ln_ser - ln_ser; };
    double from = std::clamp(guess_db, ser_curve::lowest_db, ser_curve::highest_db), step = 0.5;
    const bool upwards = above(from) > 0;
    const double end = upwards ? ser_curve::highest_db : ser_curve::lowest_db;
    double to = from;
    while (true) {
        to = upwards ? std::min(from + step, end) : std::max(from - step, end);
        if ((above(to) > 0) != upwards)
            break;
        if (to == end)
            return end;
        from = to;
        step *= 2;
    }
    std::uintmax_t rounds = 100;
    const auto ends = boost::math::tools::toms748_solve(
        above, std::min(from, to), std::max(from, to), boost::math::tools::eps_tolerance<double>(40), rounds);
    return (ends.first + ends.second) / 2;
}

std::vector<loss>
find_losses(const predictor& p, const ser_curve& curve, const residual_sums& sums, const loss_question& asked)
{
    const auto fit = fit_residuals(sums);
    if (!fit || sums.moments.symbols == 0)
        return {};
    finder all(p.set(), sums, *fit, asked);
    const double alone_db = asked.input_es_n0_db.value_or(to_db(all.noise_es_n0()));
    const auto worth = [&](const impairment& link) { return es_n0_db_of(curve, ln_ser(p, link), alone_db); };
    const double with_all = worth(all.full);

    std::vector<loss> rows;
    double sum = 0;
    for (const auto& f : all.found) {
        impairment without = all.full;
        f.mend(without);
        const double cost = worth(without) - with_all;
        sum += cost;
        rows.push_back({f.what, std::nullopt, cost});
        if (f.power > 0)
            rows.back().power_db = to_db(f.power);
    }
    std::sort(rows.begin(), rows.end(), [](const loss& a, const loss& b) { return a.cost_db > b.cost_db; });
    if (rows.size() > 1)
        rows.push_back({cause::interaction, std::nullopt, alone_db - with_all - sum});
    if (asked.achieved_es_n0_db)
        rows.push_back({cause::unexplained, std::nullopt, with_all - *asked.achieved_es_n0_db});
    return rows;
}

} // namespace halfplane
