// SPDX-License-Identifier: GPL-3.0-or-later
// shortfall: binned record of Es/N0, root finding on the exact curve, interval by the covariance of rate and
// gauge.
#include "halfplane/shortfall.h"

#include <boost/math/distributions/normal.hpp>
#include <boost/math/tools/roots.hpp>

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

constexpr double db_of_natural = 4.342944819032518276511289189166; // 10/ln 10

} // namespace

void snr_record::bin::merge(const bin& other)
{
    const auto n = static_cast<double>(symbols), m = static_cast<double>(other.symbols);
    const double apart = other.mean - mean;
    mean += apart * m / (n + m);
    squares += other.squares + apart * apart * n * m / (n + m);
    symbols += other.symbols;
    n_variance += other.n_variance;
    n2_variance += other.n2_variance;
    error_influence += other.error_influence;
}

void snr_record::add(const stretch& s)
{
    if (s.symbols == 0)
        return;
    const auto n = static_cast<double>(s.symbols);
    const auto place = [&](double db) {
        return static_cast<long long>(std::floor(std::ldexp(db, -d_width_exponent)));
    };
    d_bins[place(s.es_n0_db)].merge(
        {s.symbols, s.es_n0_db, 0, n * s.variance, n * n * s.variance, s.error_influence});
    d_symbols += s.symbols;
    while (d_bins.size() > most_bins) {
        ++d_width_exponent;
        std::map<long long, bin> wider;
        for (const auto& [key, b] : d_bins)
            wider[key >> 1].merge(b);
        d_bins.swap(wider);
    }
}

double snr_record::lowest_db() const
{
    double least = ser_curve::highest_db;
    for (const auto& entry : d_bins)
        least = std::min(least, entry.second.mean);
    return least;
}

double snr_record::highest_db() const
{
    double most = ser_curve::lowest_db;
    for (const auto& entry : d_bins)
        most = std::max(most, entry.second.mean);
    return most;
}

snr_record::expectation snr_record::at(const ser_curve& curve, double shift_db) const
{
    struct term {
        double ln, slope;
        const bin* from;
    };
    std::vector<term> terms;
    terms.reserve(d_bins.size());
    double peak = -HUGE_VAL;
    const auto all = static_cast<double>(d_symbols);
    for (const auto& entry : d_bins) {
        const bin& b = entry.second;
        const auto n = static_cast<double>(b.symbols);
        const auto v = curve.at(b.mean - shift_db);
        // Spread within the bin, less what of it and of the spread among bins is the gauge's own error.
        const double spread = b.squares / n - (b.n_variance - b.n2_variance / all) / n;
        const double ln = std::log(n) + v.ln_ser + 0.5 * (v.slope * v.slope + v.curvature) * spread;
        terms.push_back({ln, v.slope, &b});
        peak = std::max(peak, ln);
    }
    double sum = 0, slope = 0, variance = 0, covariance = 0;
    for (const auto& t : terms) {
        const double errors = std::exp(t.ln - peak); // in units of e^peak
        const auto n = static_cast<double>(t.from->symbols);
        const double pull = errors * t.slope / n; // of one symbol
        sum += errors;
        slope -= errors * t.slope;
        variance += pull * pull * t.from->n2_variance;
        covariance -= pull * db_of_natural * t.from->error_influence;
    }
    return {peak + std::log(sum), slope / sum, variance / (slope * slope), covariance / slope};
}

namespace {

/// x with Σ n·SER(γ − x) = errors; nothing where no shift within the curve's range does it.
std::optional<double> shift_for(const snr_record& record, const ser_curve& curve, double errors)
{
    if (!(errors > 0))
        return std::nullopt;
    const double wanted = std::log(errors);
    const auto excess = [&](double x) { return record.at(curve, x).ln_errors - wanted; };
    // Bracket in steps that double from 0 outwards: the far ends of the curve are seldom needed, and cost
    // panels.
    const double least = record.highest_db() - ser_curve::highest_db,
                 most = record.lowest_db() - ser_curve::lowest_db;
    double from = std::clamp(0.0, least, most), step = 1;
    const bool upwards = excess(from) < 0;
    double to = from;
    while (true) {
        to = std::clamp(upwards ? from + step : from - step, least, most);
        if ((excess(to) < 0) != upwards)
            break;
        if (to == (upwards ? most : least))
            return std::nullopt;
        from = to;
        step *= 2;
    }
    std::uintmax_t rounds = 100;
    const auto ends = boost::math::tools::toms748_solve(excess,
                                                        std::min(from, to),
                                                        std::max(from, to),
                                                        boost::math::tools::eps_tolerance<double>(50),
                                                        rounds);
    return (ends.first + ends.second) / 2;
}

} // namespace

shortfall find_shortfall(const snr_record& record, const ser_curve& curve, const shortfall_question& asked)
{
    shortfall answer;
    if (record.symbols() == 0)
        return answer;
    const auto n = static_cast<double>(record.symbols());
    const boost::math::normal gaussian;
    const double beyond = 1 - asked.confidence;
    const double one_sided = boost::math::quantile(boost::math::complement(gaussian, beyond));
    const double two_sided = boost::math::quantile(boost::math::complement(gaussian, beyond / 2));
    const auto sigma_at = [&](double x) {
        return std::sqrt(record.at(curve, x).variance + asked.common_variance);
    };

    const auto x_high = shift_for(record, curve, n * asked.ser.high);
    if (asked.errors == 0) {
        if (x_high)
            answer.high = *x_high + one_sided * sigma_at(*x_high);
        return answer;
    }
    std::optional<double> x_low;
    if (asked.ser.low)
        x_low = shift_for(record, curve, n * *asked.ser.low);
    const auto x = shift_for(record, curve, static_cast<double>(asked.errors));
    if (!x) {
        if (x_low)
            answer.low = *x_low - two_sided * sigma_at(*x_low);
        return answer;
    }
    const auto there = record.at(curve, *x);
    const double sigma = std::sqrt(there.variance + asked.common_variance);
    const double p = static_cast<double>(asked.errors) / n;
    const double of_errors = std::sqrt(n * p * (1 - p) * std::max(asked.dispersion, 1.0));
    const double rho =
        sigma > 0 && of_errors > 0 ? std::clamp(there.covariance / (sigma * of_errors), -1.0, 1.0) : 0.0;
    const auto half_width = [&](double a) {
        const double u = two_sided * sigma;
        return std::sqrt(std::max(0.0, a * a + u * u + 2 * rho * a * u));
    };
    answer.db = *x;
    if (x_low)
        answer.low = *x - half_width(*x - *x_low);
    if (x_high)
        answer.high = *x + half_width(*x_high - *x);
    return answer;
}

} // namespace halfplane
