// SPDX-License-Identifier: GPL-3.0-or-later
// residuals: sums against brute force, least squares against its normal equations, which symbols are looked
// at.
#include "halfplane/residuals.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <random>
#include <tuple>

using namespace halfplane;

namespace {

constexpr std::size_t run = residual_gatherer::stretch + 2 * column::reach;

struct stream {
    std::vector<std::complex<float>> in;
    std::vector<reference_t> sent;
};

/// `n` symbols with noise of deviation 0.1 and a bit of everything else.
stream random_stream(const signal_set& set, std::size_t n, std::uint64_t seed)
{
    std::mt19937_64 random(seed);
    std::normal_distribution<float> normal(0, 0.1f);
    stream s;
    for (std::size_t k = 0; k < n; ++k) {
        s.sent.push_back(static_cast<reference_t>(random() % set.size()));
        const auto p = set.points()[static_cast<std::size_t>(s.sent.back())];
        const auto late = k > 1 ? set.points()[static_cast<std::size_t>(s.sent[k - 2])] : complex{};
        const auto x = 0.97 * std::polar(1.0, 0.05) * p + 0.03 * std::conj(p) + complex(0.02, -0.01) +
                       complex(0.01, 0.05) * late - 0.01 * p * std::norm(p);
        s.in.push_back(std::complex<float>(x) + std::complex<float>(normal(random), normal(random)));
    }
    return s;
}

/// Waits until the gatherer takes the next run of good symbols, then gives it exactly one.
void give(residual_gatherer& g, const stream& s, std::size_t first)
{
    const std::vector<std::complex<float>> silence(2 * residual_gatherer::period);
    const std::vector<reference_t> excluded(silence.size(), code(exclusion::slip));
    g.add(silence.data(), excluded.data(), silence.size());
    g.add(&s.in[first], &s.sent[first], run);
}

/// The columns and e at symbol k, as the header defines them.
std::array<complex, residual_sums::rows> row_of(const signal_set& set, const stream& s, std::size_t k)
{
    const double scale = std::sqrt(set.es());
    const auto at = [&](std::size_t j) { return set.points()[static_cast<std::size_t>(s.sent[j])] / scale; };
    double kappa = 0;
    for (std::size_t i = 0; i < set.size(); ++i)
        kappa += set.priors()[i] * std::pow(std::norm(set.points()[i]) / set.es(), 2);
    const complex p = at(k);
    return {p,
            1,
            std::conj(p),
            at(k - 4),
            at(k - 3),
            at(k - 2),
            at(k - 1),
            at(k + 1),
            at(k + 2),
            at(k + 3),
            at(k + 4),
            p * (std::norm(p) - kappa),
            complex(s.in[k]) / scale - p};
}

} // namespace

TEST(Residuals, SumsAreThoseOfTheColumns)
{
    const auto set = load_set(std::string(HALFPLANE_SOURCE_DIR) + "/examples/sets/firn-12.json");
    const auto s = random_stream(set, 3 * run, 1);
    residual_gatherer g(set);
    std::array<std::array<complex, residual_sums::rows>, residual_sums::rows> expected{};
    double worst = 0;
    for (std::size_t part = 0; part < 3; ++part) {
        give(g, s, part * run);
        for (std::size_t k = part * run + column::reach; k < (part + 1) * run - column::reach; ++k) {
            const auto row = row_of(set, s, k);
            for (std::size_t i = 0; i < row.size(); ++i)
                for (std::size_t j = 0; j < row.size(); ++j)
                    expected[i][j] += std::conj(row[i]) * row[j];
        }
    }
    const auto sums = g.take();
    ASSERT_EQ(sums.symbols(), 3 * residual_gatherer::stretch);
    for (std::size_t j = 0; j < residual_sums::rows; ++j)
        for (std::size_t i = 0; i <= j; ++i)
            worst = std::max(worst, std::abs(sums.product(i, j) - expected[i][j]));
    std::cout << "worst sum off by " << worst << " of " << sums.symbols() << '\n';
    EXPECT_LT(worst, 1e-12 * static_cast<double>(sums.symbols())); // rounding of 1,536 additions
    EXPECT_EQ(g.take().symbols(), 0u);

    // The third stretch was measured against the fit of the first two.
    EXPECT_EQ(sums.moments.symbols, residual_gatherer::stretch);
}

TEST(Residuals, FitSolvesTheNormalEquations)
{
    const auto set = named_set("qam:16");
    const auto s = random_stream(set, 4 * run, 2);
    residual_gatherer g(set);
    for (std::size_t part = 0; part < 4; ++part)
        give(g, s, part * run);
    const auto sums = g.take();
    const auto fit = fit_residuals(sums);
    ASSERT_TRUE(fit);
    const auto gram = [&](std::size_t i, std::size_t j) {
        return i <= j ? sums.product(i, j) : std::conj(sums.product(j, i));
    };
    double left = gram(column::count, column::count).real();
    for (std::size_t i = 0; i < column::count; ++i) {
        complex sum = 0;
        for (std::size_t j = 0; j < column::count; ++j) {
            sum += gram(i, j) * fit->value[j];
            complex unit = 0;
            for (std::size_t k = 0; k < column::count; ++k)
                unit += gram(i, k) * fit->inverse[k][j];
            EXPECT_NEAR(std::abs(unit - (i == j ? 1.0 : 0.0)), 0, 1e-11) << i << ' ' << j;
        }
        EXPECT_NEAR(std::abs(sum - gram(i, column::count)), 0, 1e-9) << i;
        left -= std::real(std::conj(fit->value[i]) * gram(i, column::count));
    }
    EXPECT_NEAR(fit->n0, left / (2048 - 12), 1e-12);
    EXPECT_EQ(fit->neighbours, 8u);
    // What was put in, 5 standard errors of 0.1·√2/√Es/√2048 about it.
    const double scale = std::sqrt(set.es()), error = 5 * 0.141 / scale / std::sqrt(2048.0);
    EXPECT_NEAR(std::abs(fit->value[column::neighbour(-2)] - complex(0.01, 0.05)), 0, error);
    EXPECT_NEAR(std::abs(fit->value[column::image] - 0.03), 0, error);
    EXPECT_NEAR(std::abs(fit->value[column::offset] - complex(0.02, -0.01) / scale), 0, error);
    EXPECT_NEAR(std::abs(fit->value[column::neighbour(1)]), 0, error);
}

TEST(Residuals, ColumnsThatTheSetCannotTellApartAreLeftOut)
{
    const auto line = signal_set::with_natural_labels({-3, -1, 1, 3}, "line");
    for (const auto& [set, image, compression] : {std::tuple{named_set("psk:2"), false, false},
                                                  {named_set("psk:4"), true, false},
                                                  {line, false, true}}) {
        const auto& name = set.name();
        const auto s = random_stream(set, run, 3);
        residual_gatherer g(set);
        give(g, s, 0);
        const auto fit = fit_residuals(g.take());
        ASSERT_TRUE(fit) << name;
        EXPECT_TRUE(fit->known[column::gain]);
        EXPECT_EQ(fit->known[column::image], image) << name;
        EXPECT_EQ(fit->known[column::compression], compression) << name;
        EXPECT_EQ(fit->strength(column::image) > 0, image) << name;
    }
}

TEST(Residuals, AStretchIsWhole)
{
    const auto set = named_set("psk:4");
    auto s = random_stream(set, run, 4);
    for (const std::size_t place : {std::size_t{0}, run / 2, run - 1}) {
        for (const bool excluded : {false, true}) {
            auto broken = s;
            if (excluded)
                broken.sent[place] = code(exclusion::overflow);
            else
                broken.in[place] = {0, INFINITY};
            residual_gatherer g(set);
            give(g, broken, 0);
            EXPECT_EQ(g.take().symbols(), 0u) << place << ' ' << excluded;
        }
    }
}

TEST(Residuals, HoweverTheStreamIsCut)
{
    const auto set = named_set("qam:16");
    const auto s = random_stream(set, 60000, 5);
    residual_gatherer whole(set), pieces(set);
    whole.add(s.in.data(), s.sent.data(), s.in.size());
    residual_sums merged;
    std::mt19937_64 random(6);
    for (std::size_t k = 0; k < s.in.size();) {
        const auto n = std::min<std::size_t>(random() % 3000, s.in.size() - k);
        pieces.add(&s.in[k], &s.sent[k], n);
        merged.merge(pieces.take());
        k += n;
    }
    const auto all = whole.take();
    // One stretch in each period, but for the ends.
    EXPECT_NEAR(static_cast<double>(all.symbols()), 60000.0 / 8, 1024);
    ASSERT_EQ(merged.symbols(), all.symbols());
    EXPECT_EQ(merged.moments.symbols, all.moments.symbols);
    EXPECT_NEAR(merged.moments.fourth / all.moments.fourth, 1, 1e-13);
    EXPECT_NEAR(merged.moments.tangential_gain / all.moments.tangential_gain, 1, 1e-13);
    for (std::size_t j = 0; j < residual_sums::rows; ++j)
        EXPECT_NEAR(std::abs(merged.product(0, j) - all.product(0, j)), 0, 1e-9);
}

TEST(Residuals, TooFewSymbols)
{
    EXPECT_FALSE(fit_residuals({}));
}
