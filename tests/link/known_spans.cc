// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans: the constant delay, every way in which spans meet each other and the edge of the hold-back,
// and the account; against a plain map from symbol to code, for calls of every size.
#include "halfplane/link/known_spans.h"

#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <random>
#include <string>

using namespace halfplane;
using namespace halfplane::link;

namespace {

using sample = std::complex<float>;
using indices = std::vector<std::uint16_t>;

constexpr reference_t decoded(reference_t index)
{
    return static_cast<reference_t>(index + 0x1000); // the bit that symbol_code.h promises
}

/// A stream of numbered samples through `spans`, in calls of the sizes asked for.
struct stream {
    explicit stream(std::size_t hold_back, const char* set = "psk:8") : spans(named_set(set), hold_back) {}

    std::size_t feed(std::size_t count)
    {
        std::vector<sample> in(count), out(count);
        std::vector<reference_t> code(count);
        for (std::size_t k = 0; k < count; ++k)
            in[k] = {static_cast<float>(spans.taken() + k), 2.0f};
        const std::size_t n = spans.process(in.data(), count, out.data(), code.data());
        keep(n, out, code);
        return n;
    }

    std::size_t finish(std::size_t room)
    {
        std::vector<sample> out(room);
        std::vector<reference_t> code(room);
        const std::size_t n = spans.finish(room, out.data(), code.data());
        keep(n, out, code);
        return n;
    }

    void keep(std::size_t n, const std::vector<sample>& out, const std::vector<reference_t>& code)
    {
        samples.insert(samples.end(), out.begin(), out.begin() + static_cast<std::ptrdiff_t>(n));
        codes.insert(codes.end(), code.begin(), code.begin() + static_cast<std::ptrdiff_t>(n));
    }

    void expect_everything(std::size_t symbols) const
    {
        ASSERT_EQ(samples.size(), symbols);
        for (std::size_t k = 0; k < symbols; ++k)
            ASSERT_EQ(samples[k], sample(static_cast<float>(k), 2.0f)) << "symbol " << k;
        const auto& c = spans.counts();
        EXPECT_EQ(c.known + c.decoded + c.live, symbols);
        const auto known = [](reference_t r) { return r >= 0 && r < 0x1000; };
        EXPECT_EQ(c.known, static_cast<std::uint64_t>(std::count_if(codes.begin(), codes.end(), known)));
        EXPECT_EQ(c.live, static_cast<std::uint64_t>(std::count(codes.begin(), codes.end(), live_code)));
    }

    known_spans spans;
    std::vector<sample> samples;
    std::vector<reference_t> codes;
};

/// Codes of the first 20 symbols after the spans were added ahead of the stream.
std::vector<reference_t> codes_of(const std::vector<known_span>& all, span_counts* counts = nullptr)
{
    stream s(10);
    for (const auto& span : all)
        s.spans.add(span);
    s.feed(20);
    s.finish(20);
    s.expect_everything(20);
    if (counts)
        *counts = s.spans.counts();
    return s.codes;
}

std::string refusal(const known_span& span)
{
    stream s(10);
    try {
        s.spans.add(span);
    } catch (const std::invalid_argument& e) {
        s.feed(20);
        s.finish(20);
        EXPECT_EQ(s.spans.counts().live, 20u); // nothing of it applies
        EXPECT_EQ(s.spans.counts().spans, 0u);
        return e.what();
    }
    return "accepted";
}

constexpr reference_t live = live_code;

} // namespace

TEST(KnownSpans, DelayIsConstantForEverySizeOfCall)
{
    for (const std::size_t hold_back : {0, 1, 7, 1000, 1024, 4096})
        for (const std::size_t chunk : {1, 3, 7, 1000, 1023, 1024, 4095, 5000, 12000}) {
            SCOPED_TRACE("hold_back " + std::to_string(hold_back) + ", calls of " + std::to_string(chunk));
            stream s(hold_back);
            s.spans.add({2990, indices(20, 5)});
            std::size_t in = 0;
            while (in < 12000) {
                const std::size_t n = std::min(chunk, 12000 - in);
                s.feed(n);
                in += n;
                ASSERT_EQ(s.samples.size(), in > hold_back ? in - hold_back : 0);
                ASSERT_EQ(s.spans.written(), s.samples.size());
                ASSERT_EQ(s.spans.taken(), in);
            }
            while (s.finish(chunk) > 0) {
            }
            s.expect_everything(12000);
            EXPECT_EQ(s.spans.counts().known, 20u);
            for (std::size_t k = 0; k < 12000; ++k)
                ASSERT_EQ(s.codes[k], k >= 2990 && k < 3010 ? 5 : live) << k;
        }
}

TEST(KnownSpans, SamplesPassUntouched)
{
    known_spans spans(named_set("psk:4"), 2);
    const float nan = std::numeric_limits<float>::quiet_NaN(), inf = std::numeric_limits<float>::infinity();
    const std::vector<sample> in{{nan, 1}, {inf, -inf}, {-0.0f, 1e-40f}, {3, 4}, {5, 6}};
    std::vector<sample> out(5);
    std::vector<reference_t> code(5);
    ASSERT_EQ(spans.process(in.data(), 5, out.data(), code.data()), 3u);
    EXPECT_TRUE(std::isnan(out[0].real()) && out[0].imag() == 1);
    EXPECT_EQ(out[1], in[1]);
    EXPECT_TRUE(std::signbit(out[2].real()) && out[2].imag() == 1e-40f);
}

TEST(KnownSpans, OverlapsThatAgree)
{
    span_counts c;
    // Preamble known in advance, the frame around it decoded: in either order.
    const known_span preamble{4, {1, 2, 3}}, frame{2, {7, 0, 1, 2, 3, 6}, true};
    const std::vector<reference_t> want{live,       live, decoded(7), decoded(0), 1,    2,    3,
                                        decoded(6), live, live,       live,       live, live, live,
                                        live,       live, live,       live,       live, live};
    EXPECT_EQ(codes_of({preamble, frame}, &c), want);
    EXPECT_EQ(c.spans, 2u);
    EXPECT_EQ(c.known, 3u);
    EXPECT_EQ(c.decoded, 3u);
    EXPECT_EQ(c.live, 14u);
    EXPECT_EQ(codes_of({frame, preamble}, &c), want);
    EXPECT_EQ(c.conflicts, 0u);
    // Said again, the same.
    EXPECT_EQ(codes_of({frame, preamble, frame, preamble}, &c), want);
    EXPECT_EQ(c.spans, 4u);
    EXPECT_EQ(c.conflicts, 0u);
    // Partly overlapping and adjacent ones.
    const std::vector<reference_t> run = codes_of({{5, {1, 2, 3}}, {7, {3, 4}}, {9, {5}}, {3, {7, 0, 1}}});
    EXPECT_EQ(indices(run.begin() + 3, run.begin() + 10), (indices{7, 0, 1, 2, 3, 4, 5}));
}

TEST(KnownSpans, WhatContradictsIsLeftOutWhole)
{
    for (const bool first : {false, true})
        for (const bool second : {false, true})
            for (const std::size_t place : {0, 1, 2}) { // where in the second span the two differ
                SCOPED_TRACE(std::to_string(first) + std::to_string(second) + std::to_string(place));
                known_span later{8, {1, 2, 3}, second};
                const known_span earlier{8 + place, {static_cast<std::uint16_t>(place + 2)}, first};
                span_counts c;
                const auto codes = codes_of({earlier, later}, &c);
                EXPECT_EQ(c.conflicts, 1u);
                EXPECT_EQ(c.spans, 2u);
                EXPECT_EQ(c.live, 19u);
                const auto one = static_cast<reference_t>(place + 2);
                EXPECT_EQ(codes[8 + place], first ? decoded(one) : one);
            }
}

TEST(KnownSpans, LateSymbolsAreCountedExactlyAndTheRestApplies)
{
    for (std::size_t fed = 0; fed <= 40; ++fed) {
        stream s(10);
        s.feed(fed);
        s.spans.add({8, {0, 1, 2, 3, 4, 5, 6, 7}});
        const std::uint64_t written = fed > 10 ? fed - 10 : 0;
        const std::uint64_t late = std::clamp<std::uint64_t>(written, 8, 16) - 8;
        s.feed(60 - fed);
        s.finish(60);
        s.expect_everything(60);
        EXPECT_EQ(s.spans.counts().late, late) << fed;
        EXPECT_EQ(s.spans.counts().known, 8 - late) << fed;
        for (std::size_t k = 8; k < 16; ++k)
            EXPECT_EQ(s.codes[k], k - 8 < late ? live : static_cast<reference_t>(k - 8)) << fed << ' ' << k;
    }
}

TEST(KnownSpans, LateWhileTheHoldBackEmpties)
{
    stream s(10);
    s.feed(20);
    EXPECT_EQ(s.finish(4), 4u);
    s.spans.add({12, {1, 1, 1, 1}});
    s.finish(100);
    s.expect_everything(20);
    EXPECT_EQ(s.spans.counts().late, 2u);
    EXPECT_EQ(s.spans.counts().known, 2u);
}

TEST(KnownSpans, WhatLiesBeyondTheHorizonIsEarly)
{
    const std::uint64_t horizon = known_spans::horizon;
    stream s(100);
    s.feed(1000); // kept: symbols before 1000 + horizon
    s.spans.add({1000 + horizon - 3, {1, 2, 3, 4, 5}});
    s.spans.add({1000 + horizon, {1}});
    s.spans.add({std::numeric_limits<std::uint64_t>::max(), {1, 2}});
    s.spans.add({std::numeric_limits<std::uint64_t>::max() - 1, {1, 2}});
    EXPECT_EQ(s.spans.counts().early, 7u);
    EXPECT_EQ(s.spans.counts().late, 0u);
    const std::size_t symbols = horizon + 3000;
    s.feed(symbols - 1000);
    s.finish(100);
    s.expect_everything(symbols);
    EXPECT_EQ(s.spans.counts().known, 3u);
    EXPECT_EQ(s.codes[1000 + horizon - 1], 3);
    EXPECT_EQ(s.codes[1000 + horizon], live);
}

TEST(KnownSpans, PlacesAreFreeAgainOnceTheyWentOut)
{
    // Longer than anything that is kept, so that each place comes up twice.
    stream s(100);
    const std::size_t symbols = 5 * known_spans::horizon;
    for (std::size_t k = 0; k < symbols; k += symbols / 50) {
        s.spans.add({k, indices(40, static_cast<std::uint16_t>(k % 8))});
        s.feed(symbols / 50);
    }
    s.finish(100);
    s.expect_everything(s.spans.taken());
    EXPECT_EQ(s.spans.counts().conflicts, 0u);
    EXPECT_EQ(s.spans.counts().known, 40 * s.spans.counts().spans);
}

TEST(KnownSpans, RefusalsNamePlaceAndValue)
{
    EXPECT_EQ(refusal({7, {1, 2, 8, 3}}), "index 2 of the span at symbol 7 is 8: the set has 8 points");
    EXPECT_EQ(refusal({7, {}}), "the span at symbol 7 is empty");
    EXPECT_EQ(refusal({0, {65535}, true}), "index 0 of the span at symbol 0 is 65535: the set has 8 points");
    EXPECT_EQ(refusal({7, {7}}), "accepted");
    try {
        known_spans(named_set("psk:8"), known_spans::longest_hold_back + 1);
        ADD_FAILURE() << "accepted";
    } catch (const std::invalid_argument& e) {
        EXPECT_STREQ(e.what(), "known_spans: hold_back is 16777217; at most 16777216 symbols are wanted");
    }
}

TEST(KnownSpans, TheLargestSetKeepsItsFlagApart)
{
    stream s(4, "qam:4096");
    s.spans.add({0, {4095, 0, 4095}, true});
    s.spans.add({2, {4095, 4095}});
    s.feed(8);
    s.finish(8);
    s.expect_everything(8);
    EXPECT_EQ(s.codes,
              (std::vector<reference_t>{decoded(4095), decoded(0), 4095, 4095, live, live, live, live}));
}

// Spans of every kind against a map from symbol to code that knows of no delay line, no ring and no call
// size.
TEST(KnownSpans, AgreesWithAPlainMap)
{
    std::uint64_t all_late = 0, all_conflicts = 0;
    for (std::uint32_t seed = 1; seed <= 40; ++seed) {
        SCOPED_TRACE("seed " + std::to_string(seed));
        std::mt19937 draw(seed);
        const auto below = [&](std::size_t n) {
            return std::uniform_int_distribution<std::size_t>(0, n - 1)(draw);
        };
        const std::size_t hold_back = below(600);
        // A hidden truth from which most spans quote rightly, so that overlaps mostly agree.
        indices truth(30000);
        for (auto& t : truth)
            t = static_cast<std::uint16_t>(below(8));

        stream s(hold_back);
        std::map<std::uint64_t, reference_t> model;
        std::uint64_t late = 0, conflicts = 0, added = 0;
        while (s.spans.taken() < 20000) {
            s.feed(below(1 + below(2000)));
            for (std::size_t n = below(4); n > 0; --n) {
                known_span span;
                const std::uint64_t near = s.spans.taken() + below(800);
                span.first_symbol = near > 1000 ? near - below(1000) : near;
                span.decoded = below(2);
                for (std::size_t k = 0, size = 1 + below(300); k < size; ++k)
                    span.indices.push_back(truth[span.first_symbol + k]);
                if (below(4) == 0)
                    span.indices[below(span.indices.size())] ^= 1;
                s.spans.add(span);

                ++added;
                std::map<std::uint64_t, reference_t> pieces;
                bool agrees = true;
                for (std::size_t k = 0; k < span.indices.size(); ++k) {
                    const std::uint64_t symbol = span.first_symbol + k;
                    if (symbol < s.samples.size()) {
                        ++late;
                        continue;
                    }
                    const auto index = static_cast<reference_t>(span.indices[k]);
                    const auto there = model.find(symbol);
                    agrees &= there == model.end() || there->second % 0x1000 == index;
                    const bool stays = there != model.end() && span.decoded;
                    pieces[symbol] = stays ? there->second : span.decoded ? decoded(index) : index;
                }
                conflicts += !agrees;
                if (agrees)
                    for (const auto& [symbol, code] : pieces)
                        model[symbol] = code;
            }
        }
        const std::size_t symbols = s.spans.taken();
        while (s.finish(1 + below(100)) > 0) {
        }
        s.expect_everything(symbols);
        EXPECT_EQ(s.spans.counts().spans, added);
        EXPECT_EQ(s.spans.counts().late, late);
        EXPECT_EQ(s.spans.counts().conflicts, conflicts);
        all_late += late;
        all_conflicts += conflicts;
        for (std::size_t k = 0; k < symbols; ++k) {
            const auto known = model.find(k);
            ASSERT_EQ(s.codes[k], known == model.end() ? live : known->second) << "symbol " << k;
        }
    }
    EXPECT_GT(all_late, 1000u);
    EXPECT_GT(all_conflicts, 100u);
}
