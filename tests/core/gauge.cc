// SPDX-License-Identifier: GPL-3.0-or-later
// gauge: against least squares in two passes, over 1e9 symbols with an offset, and where there is nothing to
// say.
#include "halfplane/gauge.h"

#include <gtest/gtest.h>

#include <cmath>
#include <random>

using namespace halfplane;

namespace {

using wide = std::complex<long double>;

struct stream {
    std::vector<std::complex<float>> received;
    std::vector<std::uint16_t> sent, decided;
};

const signal_set& square()
{
    static const auto set = signal_set::with_natural_labels({{1, 1}, {-1, 1}, {-3, -1}, {1, -2}, {0.3, 0.1}});
    return set;
}

/// r = g·s + o + e, a tenth of the symbols marked wrong where the noise is largest.
stream draw(std::size_t n, complex g, complex o, double n0, unsigned seed)
{
    std::mt19937_64 random(seed);
    std::normal_distribution<double> normal(0, std::sqrt(n0 / 2));
    stream s;
    for (std::size_t k = 0; k < n; ++k) {
        const auto i = static_cast<std::uint16_t>(random() % square().size());
        const complex e{normal(random), normal(random)};
        s.received.emplace_back(g * square().points()[i] + o + e);
        s.sent.push_back(i);
        s.decided.push_back(std::norm(e) > 2.3 * n0 ? static_cast<std::uint16_t>((i + 1) % 5) : i);
    }
    return s;
}

/// The same by the definition: means, then residuals symbol by symbol.
gauge_result two_passes(const stream& s)
{
    const auto n = static_cast<long double>(s.sent.size());
    wide r_mean = 0, s_mean = 0, rs = 0;
    long double ss = 0, residual = 0, power = 0;
    auto point = [&](std::size_t k) { return wide(square().points()[s.sent[k]]); };
    for (std::size_t k = 0; k < s.sent.size(); ++k) {
        r_mean += wide(s.received[k]) / n;
        s_mean += point(k) / n;
    }
    for (std::size_t k = 0; k < s.sent.size(); ++k) {
        rs += (wide(s.received[k]) - r_mean) * std::conj(point(k) - s_mean);
        ss += std::norm(point(k) - s_mean);
    }
    const wide g = rs / ss, o = r_mean - g * s_mean;
    for (std::size_t k = 0; k < s.sent.size(); ++k) {
        residual += std::norm(wide(s.received[k]) - g * point(k) - o);
        power += std::norm(g * point(k));
    }
    const long double n0 = residual / (n - 2);
    long double influence = 0;
    for (std::size_t k = 0; k < s.sent.size(); ++k) {
        const wide e = wide(s.received[k]) - g * point(k) - o;
        if (s.sent[k] != s.decided[k])
            influence +=
                2 * std::real(e * std::conj(point(k) - s_mean) / (g * (ss / n))) - (std::norm(e) / n0 - 1);
    }
    gauge_result x{};
    x.gain = complex(g);
    x.offset = complex(o);
    x.n0 = static_cast<double>(n0);
    x.es_n0 = static_cast<double>(std::norm(g) * square().es() / n0);
    x.es_n0_db_se = static_cast<double>(10 / std::log(10.0L) * std::sqrt(1 / n + 2 / (n * x.es_n0)));
    x.evm_rms = static_cast<double>(std::sqrt(residual / power));
    x.mer_db = -20 * std::log10(x.evm_rms);
    x.error_influence = static_cast<double>(influence);
    return x;
}

double difference(const gauge_result& a, const gauge_result& b)
{
    auto off = [](double x, double y) { return std::abs(x - y) / std::abs(y); };
    return std::max({std::abs(a.gain - b.gain) / std::abs(b.gain),
                     std::abs(a.offset - b.offset) / std::abs(b.gain),
                     off(a.n0, b.n0),
                     off(a.es_n0, b.es_n0),
                     off(a.es_n0_db_se, b.es_n0_db_se),
                     off(a.evm_rms, b.evm_rms),
                     off(a.mer_db, b.mer_db),
                     off(a.error_influence, b.error_influence)});
}

gauge gauged(const stream& s)
{
    gauge x;
    x.add(s.received.data(), s.sent.data(), s.decided.data(), s.sent.size(), square().points());
    return x;
}

} // namespace

TEST(Gauge, AgreesWithTwoPassesAndMergesExactly)
{
    double worst = 0;
    for (double db : {0.0, 20.0, 40.0}) {
        const auto s = draw(20000, {0.3, -1.1}, {2, 1}, square().es() * std::pow(10.0, -db / 10), 3);
        const auto expected = two_passes(s);
        worst = std::max(worst, difference(*gauged(s).solve(square()), expected));
        gauge merged;
        for (std::size_t first = 0; first < s.sent.size();) {
            const std::size_t n = std::min<std::size_t>(1 + 37 * (first % 101), s.sent.size() - first);
            gauge part;
            part.add(&s.received[first], &s.sent[first], &s.decided[first], n, square().points());
            merged.merge(part);
            first += n;
        }
        worst = std::max(worst, difference(*merged.solve(square()), expected));
    }
    std::cout << "largest relative difference from two passes: " << worst << '\n';
    EXPECT_LE(worst, 1e-10);
}

TEST(Gauge, ABillionSymbolsUnderAnOffsetKeepNineDigits)
{
    // 1,024 symbols, a million times over: the sums take a million real additions, and the answer is that of
    // 1,024 up to the divisor n − 2.
    const auto s = draw(1024, {0.3, -1.1}, {3, -4}, square().es() / 100, 4);
    const auto once = two_passes(s);
    gauge all;
    const gauge part = gauged(s);
    const int times = 1000000;
    for (int k = 0; k < times; ++k)
        all.merge(part);
    const auto many = *all.solve(square());
    const double n = 1024.0 * times;
    const double n0 = once.n0 * (1022.0 / 1024) * n / (n - 2);
    std::cout << "n = " << all.count() << ", relative error of N0 " << std::abs(many.n0 / n0 - 1) << '\n';
    EXPECT_EQ(all.count(), 1024000000u);
    EXPECT_NEAR(many.n0 / n0, 1, 1e-9);
    EXPECT_NEAR(std::abs(many.gain - once.gain), 0, 1e-12);
    EXPECT_NEAR(std::abs(many.offset - once.offset), 0, 1e-12);
}

TEST(Gauge, StandardErrorAndCovarianceAreThoseSeenOverManyRuns)
{
    // 4,000 runs of 500 symbols; variance of γ in dB and its covariance with the number of marked symbols
    // against what each run claims. The relative error of a variance over 4,000 runs is √(2/4000) = 2.2 %, of
    // the covariance √((1 + 1/ρ²)/4000) < 3.5 %: five of them are allowed.
    const int runs = 4000;
    const std::size_t n = 500;
    double sum = 0, sum2 = 0, errors_sum = 0, errors2 = 0, cross = 0, claimed = 0, claimed_cross = 0;
    for (int run = 0; run < runs; ++run) {
        const auto s = draw(n, {1, 0.2}, {0.1, 0}, square().es() / 10, 1000 + static_cast<unsigned>(run));
        const auto x = *gauged(s).solve(square());
        double errors = 0;
        for (std::size_t k = 0; k < n; ++k)
            errors += s.sent[k] != s.decided[k];
        const double db = 10 * std::log10(x.es_n0);
        sum += db;
        sum2 += db * db;
        errors_sum += errors;
        errors2 += errors * errors;
        cross += db * errors;
        claimed += x.es_n0_db_se * x.es_n0_db_se / runs;
        claimed_cross += 10 / std::log(10.0) * x.error_influence / static_cast<double>(n) / runs;
    }
    const double variance = sum2 / runs - sum / runs * (sum / runs);
    const double covariance = cross / runs - sum / runs * (errors_sum / runs);
    const double error_variance = errors2 / runs - errors_sum / runs * (errors_sum / runs);
    std::cout << "variance of gamma " << variance << ", claimed " << claimed << "; covariance " << covariance
              << ", claimed " << claimed_cross << ", correlation "
              << covariance / std::sqrt(variance * error_variance) << '\n';
    EXPECT_NEAR(claimed / variance, 1, 5 * 0.022);
    EXPECT_NEAR(claimed_cross / covariance, 1, 5 * 0.035);
    EXPECT_LT(covariance, 0);
}

TEST(Gauge, SaysNothingWhereThereIsNothingToSay)
{
    auto s = draw(1000, {1, 0}, {0, 0}, 0.1, 5);
    gauge two;
    two.add(s.received.data(), s.sent.data(), s.decided.data(), 2, square().points());
    EXPECT_FALSE(gauge().solve(square()));
    EXPECT_FALSE(two.solve(square()));

    auto one_point = s;
    for (auto& i : one_point.sent)
        i = 4; // (0.3, 0.1): its square is not exact
    EXPECT_FALSE(gauged(one_point).solve(square()));

    auto silent = draw(1000, {1, 0}, {0, 0}, 0, 6);
    for (std::size_t k = 0; k < silent.received.size(); ++k)
        silent.received[k] = {static_cast<float>(silent.sent[k] % 2), 0}; // exact, and linear in two points
    const auto pair = signal_set::with_natural_labels({{0, 0}, {1, 0}});
    for (auto& i : silent.sent)
        i %= 2;
    gauge noiseless;
    noiseless.add(silent.received.data(), silent.sent.data(), silent.sent.data(), 1000, pair.points());
    EXPECT_FALSE(noiseless.solve(pair));

    auto muted = s;
    for (auto& r : muted.received)
        r = 0;
    EXPECT_FALSE(gauged(muted).solve(square()));
}

TEST(Gauge, OneSymbolAtATimeIsTheSame)
{
    const auto s = draw(500, {0.5, 0.5}, {0.1, 0}, 0.2, 8);
    gauge single;
    for (std::size_t k = 0; k < s.sent.size(); ++k)
        single.add(s.received[k], square().points()[s.sent[k]], s.sent[k] != s.decided[k]);
    EXPECT_LE(difference(*single.solve(square()), two_passes(s)), 1e-10);
}
