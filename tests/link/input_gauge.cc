// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge: against the Es/N0 that signals were made with, the scatter against the error it claims,
// refusals.
#include "halfplane/link/input_gauge.h"

#include "halfplane/rates.h"
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <functional>
#include <limits>
#include <random>

using namespace halfplane;
using namespace halfplane::link;

namespace {

using samples = std::vector<std::complex<float>>;
constexpr double pi = M_PI;

/// Root raised cosine at time t in symbols, of unit energy over continuous time (closed form; Proakis and
/// Salehi, Digital Communications, 5th ed., section 9.2, from memory; its energy is checked below).
double root_raised_cosine(double t, double beta)
{
    if (std::abs(t) < 1e-9)
        return 1 - beta + 4 * beta / pi;
    if (std::abs(std::abs(4 * beta * t) - 1) < 1e-9)
        return beta / std::sqrt(2) *
               ((1 + 2 / pi) * std::sin(pi / (4 * beta)) + (1 - 2 / pi) * std::cos(pi / (4 * beta)));
    return (std::sin(pi * t * (1 - beta)) + 4 * beta * t * std::cos(pi * t * (1 + beta))) /
           (pi * t * (1 - 16 * beta * beta * t * t));
}

struct link_made {
    double sample_rate = 4e5, symbol_rate = 1e5, centre = 0, beta = 0.25, es_n0_db = 10;
    const char* set = "qam:16";
    bool on = true;
    std::vector<double> colour{1}; // taps that the noise goes through
    unsigned seed = 1;
};

constexpr double noise_density = 3e-7; // power per Hz

/// Every pulse by its formula at the instants of the samples, so that any number of samples a symbol will do.
samples make(const link_made& l, std::size_t n)
{
    const auto set = named_set(l.set);
    std::mt19937_64 random(l.seed);
    std::discrete_distribution<std::size_t> index(set.priors().begin(), set.priors().end());
    std::normal_distribution<double> normal(0, std::sqrt(noise_density * l.sample_rate / 2));
    const double per_symbol = l.sample_rate / l.symbol_rate; // samples
    constexpr int reach = 16; // symbols to either side: what is cut off lies some 66 dB below
    std::vector<complex> out(n);
    if (l.on) {
        // Energy of a symbol: amplitude²·Σ|h|²/sample_rate, the integral of h² being 1 symbol.
        const double amplitude = std::sqrt(from_db(l.es_n0_db) * noise_density * l.symbol_rate / set.es());
        const auto symbols = static_cast<long>(static_cast<double>(n) / per_symbol);
        for (long s = -reach; s < symbols + reach; ++s) {
            const complex a = amplitude * set.points()[index(random)];
            const auto first = static_cast<long>(std::ceil((static_cast<double>(s) - reach) * per_symbol)),
                       last = static_cast<long>(std::floor((static_cast<double>(s) + reach) * per_symbol));
            for (long k = std::max(0L, first); k <= last && k < static_cast<long>(n); ++k)
                out[static_cast<std::size_t>(k)] +=
                    a *
                    root_raised_cosine(static_cast<double>(k) / per_symbol - static_cast<double>(s), l.beta);
        }
    }
    std::vector<complex> white(n + l.colour.size());
    for (auto& w : white)
        w = {normal(random), normal(random)};
    samples noisy(n);
    for (std::size_t k = 0; k < n; ++k) {
        complex r = out[k] * std::polar(1.0, 2 * pi * l.centre / l.sample_rate * static_cast<double>(k));
        for (std::size_t t = 0; t < l.colour.size(); ++t)
            r += l.colour[t] * white[k + t];
        noisy[k] = std::complex<float>(r);
    }
    return noisy;
}

input_gauge_options options_of(const link_made& l, bool with_noise_band = true)
{
    const double half = l.symbol_rate * (1 + l.beta) / 2 * 1.05;
    input_gauge_options o{l.sample_rate, l.symbol_rate, {l.centre - half, l.centre + half}, std::nullopt, 0};
    if (with_noise_band)
        o.noise_band = frequency_band{l.centre + 1.3 * half, 0.48 * l.sample_rate};
    return o;
}

void expect_near(const std::optional<input_reading>& got, double truth, const std::string& what)
{
    ASSERT_TRUE(got) << what;
    EXPECT_LT(std::abs(got->es_n0_db - truth), 0.1) << what;
    EXPECT_LT(std::abs(got->es_n0_db - truth), 4.5 * got->es_n0_db_se + 0.02) << what;
    EXPECT_LT(got->es_n0_db_se, 0.07) << what; // else the 0.1 dB would be luck
}

std::string refusal(const input_gauge_options& o)
{
    try {
        const input_gauge gauge(o);
    } catch (const std::invalid_argument& error) {
        return error.what();
    }
    return "accepted";
}

} // namespace

TEST(InputGauge, ThePulseOfTheseTestsHasUnitEnergy)
{
    for (const double beta : {0.05, 0.25, 0.5}) {
        double energy = 0;
        for (int k = -40 * 8; k <= 40 * 8; ++k)
            energy += std::pow(root_raised_cosine(k / 8., beta), 2) / 8;
        EXPECT_NEAR(energy, 1, 2e-4) << beta; // what lies beyond 40 symbols is missing
    }
}

/// Bias below 0.1 dB by a wide margin: the readings' own errors are below 0.03 dB, and they must lie
/// within 4.5 of them.
TEST(InputGauge, FromZeroToThirtyDbAtThreeRollOffs)
{
    double worst = 0;
    for (const double beta : {0.15, 0.25, 0.5})
        for (const double db : {0., 10., 20., 30.})
            for (const double centre : {0., -41e3}) {
                link_made l;
                l.beta = beta;
                l.es_n0_db = db;
                l.centre = centre;
                l.set = centre == 0 ? "qam:16" : "hex:19";
                l.seed = static_cast<unsigned>(db) + 1;
                input_gauge gauge(options_of(l));
                const auto in = make(l, 400000);
                gauge.add(in.data(), in.size());
                const auto got = gauge.read();
                expect_near(got, db, "beta " + std::to_string(beta) + ", " + std::to_string(db) + " dB");
                EXPECT_NEAR(got->noise_density / noise_density, 1, 0.02);
                worst = std::max(worst, std::abs(got->es_n0_db - db));
            }
    std::printf("worst error %.3f dB\n", worst);
}

TEST(InputGauge, AnyNumberOfSamplesASymbol)
{
    for (const double rate : {2.0e5, 3.3e5, 1.7e6}) {
        link_made l;
        l.sample_rate = rate;
        l.es_n0_db = 12;
        input_gauge gauge(options_of(l));
        const auto in = make(l, static_cast<std::size_t>(rate));
        gauge.add(in.data(), in.size());
        expect_near(gauge.read(), 12, std::to_string(rate));
    }
}

/// With the transmitter off for a while no noise-only band is needed, and noise need not be white: N0 is what
/// the matched filter passes, here by summing |colour|² over the root raised cosine's spectrum.
TEST(InputGauge, AgainstAQuietStretchUnderColouredNoise)
{
    link_made l;
    l.beta = 0.35;
    l.es_n0_db = 15;
    l.colour = {1, 0.6, 0.3};
    double passed = 0, all = 0;
    for (double f = -0.7; f <= 0.7; f += 1e-4) { // cycles a symbol; 4 samples a symbol
        const double edge = (1 - l.beta) / 2, a = std::abs(f);
        const double h2 = a <= edge ? 1 : a >= 1 - edge ? 0 : 0.5 * (1 + std::cos(pi / l.beta * (a - edge)));
        complex c;
        for (std::size_t t = 0; t < l.colour.size(); ++t)
            c += l.colour[t] * std::polar(1.0, -2 * pi * f / 4 * static_cast<double>(t));
        passed += h2 * std::norm(c);
        all += h2;
    }
    const double truth = 15 - 10 * std::log10(passed / all);
    input_gauge gauge(options_of(l, false));
    const auto signal = make(l, 400000);
    gauge.add(signal.data(), signal.size());
    EXPECT_FALSE(gauge.read()); // nothing is known of the noise
    l.on = false;
    l.seed = 2;
    const auto quiet = make(l, 400000);
    gauge.add(quiet.data(), quiet.size(), false);
    expect_near(gauge.read(), truth, "quiet");
    gauge.restart();
    EXPECT_FALSE(gauge.read());
    gauge.add(signal.data(), signal.size());
    expect_near(gauge.read(), truth, "the quiet stretch stays known");
    gauge.restart_quiet();
    EXPECT_FALSE(gauge.read());
}

/// 300 short runs of either kind: errors over what each claims have deviation 1, within 4.5 of its own
/// (1/√600 each).
TEST(InputGauge, ScattersAsMuchAsItSays)
{
    for (const bool noise_band : {true, false})
        for (const double db : {3., 20.}) {
            double squares = 0;
            int inside = 0;
            constexpr int runs = 300;
            for (unsigned run = 0; run < runs; ++run) {
                link_made l;
                l.es_n0_db = db;
                l.seed = 1000 + run;
                input_gauge gauge(options_of(l, noise_band));
                const auto in = make(l, 20000);
                gauge.add(in.data(), in.size());
                l.on = false;
                l.seed += 5000;
                const auto quiet = make(l, 20000);
                gauge.add(quiet.data(), quiet.size(), false);
                const auto got = gauge.read();
                ASSERT_TRUE(got);
                const double error = (got->es_n0_db - db) / got->es_n0_db_se;
                squares += error * error / runs;
                inside += std::abs(error) < 1.96;
            }
            std::printf("noise band %d, %g dB: deviation %.3f of the claimed, %d of 300 within 1.96\n",
                        noise_band,
                        db,
                        std::sqrt(squares),
                        inside);
            EXPECT_NEAR(std::sqrt(squares), 1, 4.5 / std::sqrt(2. * runs));
            EXPECT_GE(inside, 268); // of 285 expected, deviation 3.8
        }
}

TEST(InputGauge, MorePerSegmentOrFewerSegmentsSayTheSame)
{
    link_made l;
    const auto in = make(l, 800000);
    auto o = options_of(l);
    o.hop = 5000;
    input_gauge sparse(o), whole(options_of(l)), cut(options_of(l));
    sparse.add(in.data(), in.size());
    whole.add(in.data(), in.size());
    for (std::size_t k = 0; k < in.size(); k += 777)
        cut.add(&in[k], std::min<std::size_t>(777, in.size() - k));
    EXPECT_EQ(whole.read()->es_n0_db, cut.read()->es_n0_db);
    EXPECT_EQ(sparse.read()->segments, 160u);
    EXPECT_NEAR(sparse.read()->es_n0_db, 10, 4.5 * sparse.read()->es_n0_db_se);
    EXPECT_GT(sparse.read()->es_n0_db_se, 2 * whole.read()->es_n0_db_se);
}

TEST(InputGauge, NonfiniteSamplesCostTheirSegments)
{
    link_made l;
    auto in = make(l, 400000);
    for (std::size_t k = 0; k < in.size(); k += 10007)
        in[k] = {std::numeric_limits<float>::quiet_NaN(), std::numeric_limits<float>::infinity()};
    input_gauge gauge(options_of(l));
    gauge.add(in.data(), in.size());
    EXPECT_EQ(gauge.nonfinite(), 40u);
    expect_near(gauge.read(), 10, "with gaps");
    EXPECT_LE(gauge.read()->segments, 400000 / (gauge.segment() / 2) - 40);
}

TEST(InputGauge, SaysNothingOfNoiseAlone)
{
    int spoke = 0;
    for (unsigned seed = 1; seed <= 100; ++seed) {
        link_made l;
        l.on = false;
        l.seed = seed;
        const auto in = make(l, 20000);
        input_gauge gauge(options_of(l));
        gauge.add(in.data(), in.size());
        if (const auto got = gauge.read()) {
            ++spoke;
            EXPECT_LT(got->es_n0_db, -10);
        }
    }
    EXPECT_LE(spoke, 9); // two standard errors: 2.3 of 100 by chance, deviation 1.5
    input_gauge gauge(options_of({}));
    const samples silence(400000);
    gauge.add(silence.data(), silence.size());
    EXPECT_FALSE(gauge.read());
}

TEST(InputGauge, RefusesByName)
{
    const input_gauge_options good{1e6, 1e5, {-7e4, 7e4}, frequency_band{1e5, 3e5}, 0};
    EXPECT_EQ(refusal(good), "accepted");
    const auto with = [&](const std::function<void(input_gauge_options&)>& change) {
        auto o = good;
        change(o);
        return refusal(o);
    };
    const double nan = std::numeric_limits<double>::quiet_NaN();
    EXPECT_EQ(with([](auto& o) { o.sample_rate = 0; }),
              "sample_rate is 0; a finite number of Hz above 0 is wanted");
    EXPECT_EQ(with([&](auto& o) { o.symbol_rate = nan; }),
              "symbol_rate is nan; a number of Hz above 0 and up to the sample rate of 1000000 is wanted");
    EXPECT_EQ(with([](auto& o) {
                  o.band = {7e4, -7e4};
              }),
              "band is 70000 … -70000 Hz; two finite frequencies in ascending order are wanted");
    EXPECT_EQ(with([](auto& o) {
                  o.band = {-4e4, 4e4};
              }),
              "band is 80000 Hz wide; a signal of 100000 symbols a second fills more");
    EXPECT_EQ(
        with([](auto& o) { o.noise_band->high = 6e5; }),
        "noise_band is 100000 … 600000 Hz; at a sample rate of 1000000 Hz it must lie within ± 500000 Hz");
    EXPECT_EQ(with([](auto& o) {
                  o.noise_band = frequency_band{5e4, 3e5};
              }),
              "noise_band 50000 … 300000 Hz overlaps band -70000 … 70000 Hz");
    EXPECT_EQ(
        with([](auto& o) {
            o.noise_band = frequency_band{1e5, 1.001e5};
        }),
        "noise_band is 100 Hz wide: too narrow at a sample rate of 1000000 Hz; resample to a lower one");
}
