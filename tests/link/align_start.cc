// SPDX-License-Identifier: GPL-3.0-or-later
// align_start: a receiver that starts in silence, with filters filling up or a loop pulling in, is corrected
// by what it is afterwards.
#include "align_link.h"

#include "halfplane/gauge.h"

#include <gtest/gtest.h>

#include <cstdio>

using namespace align_test;

namespace {

/// Es/N0 gauged over the first `count` judged symbols, dB.
double gauged_after_lock(const signal_set& set, const outcome& o, std::size_t count)
{
    halfplane::gauge gauge;
    std::vector<sample> r;
    std::vector<std::uint16_t> sent;
    for (std::size_t k = 0; k < o.out.size() && r.size() < count; ++k)
        if (o.reference[k] >= 0) {
            r.push_back(o.out[k]);
            sent.push_back(static_cast<std::uint16_t>(o.reference[k]));
        }
    gauge.add(r.data(), sent.data(), sent.data(), r.size(), set.points());
    const auto fit = gauge.solve(set);
    return fit ? 10 * std::log10(fit->es_n0) : -100;
}

struct start {
    const char* what;
    void (*spoil)(std::vector<sample>&);
};

const start starts[] = {
    {"as it is", [](std::vector<sample>&) {}},
    {"silence at first", [](std::vector<sample>& r) { std::fill_n(r.begin(), 900, sample{}); }},
    {"a few symbols of silence", [](std::vector<sample>& r) { std::fill_n(r.begin(), 40, sample{}); }},
    {"a gain that settles",
     [](std::vector<sample>& r) {
         for (std::size_t k = 0; k < 1500; ++k)
             r[k] *= static_cast<float>(1 - std::exp(-static_cast<double>(k) / 100));
     }},
    {"a phase that settles",
     [](std::vector<sample>& r) {
         for (std::size_t k = 0; k < 1500; ++k)
             r[k] *= sample(std::polar(1.0, std::exp(-static_cast<double>(k) / 100)));
     }},
};

} // namespace

TEST(AlignStart, WhatCameBeforeTheLinkStoodDoesNotSpoilItsCorrection)
{
    struct {
        const char* set;
        const char* pattern;
        double es_n0_db;
    } const cases[] = {{"qam:64", "o150:23", 40},
                       {"qam:64", "draw:2", 40},
                       {"psk:8", "o150:31", 12},
                       {"hex:19", "draw:9", 16}};
    constexpr std::size_t judged = 5000;
    for (const auto& c : cases)
        for (const auto& s : starts) {
            SCOPED_TRACE(std::string(c.set) + " " + c.pattern + ", " + s.what);
            const auto set = halfplane::load_set(c.set);
            const pattern known(c.pattern, set);
            channel ch;
            ch.es_n0_db = c.es_n0_db;
            ch.gain = std::polar(0.7, 1.2);
            ch.frequency = 3e-5;
            ch.seed = 5;
            auto r = through(set, symbols(set, known, 17, 20000), ch);
            s.spoil(r);
            aligner a(set, known);
            const double found = gauged_after_lock(set, run(a, r), judged);
            std::printf("%s %s, %s: %.3f dB of %g\n", c.set, c.pattern, s.what, found, c.es_n0_db);
            // Four standard deviations of the gauge, and what a loop of 2,000 symbols adds to the noise: 2 in
            // 2,000 for gain and phase, as much again for frequency and the start from 1,024 symbols.
            EXPECT_NEAR(found, c.es_n0_db, 4 * 4.34 / std::sqrt(static_cast<double>(judged)) + 4.34 * 0.006);
        }
}
