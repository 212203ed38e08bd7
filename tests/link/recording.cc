// SPDX-License-Identifier: GPL-3.0-or-later
// recording: formats byte by byte, metadata field by field, captures and gaps, and the judge against a count
// made offline.
#include "halfplane/link/recording.h"

#include "align_link.h"
#include "halfplane/link/judge.h"

#include <gtest/gtest.h>

#include <unistd.h>

#include <cmath>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <limits>

using namespace halfplane;
using namespace halfplane::link;
namespace fs = std::filesystem;
using json = nlohmann::json;

namespace {

class Recording : public ::testing::Test
{
protected:
    Recording()
    {
        folder = fs::temp_directory_path() / ("halfplane-recording-" + std::to_string(::getpid()));
        fs::create_directories(folder);
    }
    ~Recording() override { fs::remove_all(folder); }

    std::string write(const std::string& name, const std::string& bytes) const
    {
        std::ofstream(folder / name, std::ios::binary) << bytes;
        return (folder / name).string();
    }

    std::string sigmf(const json& global, const json& captures, const std::string& bytes) const
    {
        write("a.sigmf-data", bytes);
        return write("a.sigmf-meta",
                     json{{"global", global}, {"captures", captures}, {"annotations", json::array()}}.dump());
    }

    static std::string refusal(const std::string& path, const std::string& format = "", double rate = 0)
    {
        try {
            recording r(path, format, rate);
        } catch (const std::invalid_argument& e) {
            return e.what();
        }
        return "accepted";
    }

    fs::path folder;
};

std::string bytes_of(const std::vector<std::complex<float>>& samples)
{
    return {reinterpret_cast<const char*>(samples.data()), samples.size() * sizeof samples[0]};
}

std::vector<std::complex<float>> all_of(recording& r, std::size_t piece = 1000)
{
    std::vector<std::complex<float>> all(r.samples());
    for (std::size_t done = 0; done < all.size();)
        done += r.read(&all[done], std::min(piece, all.size() - done));
    EXPECT_EQ(r.read(all.data(), 1), 0u);
    return all;
}

using sample = std::complex<float>;

json global_of(const char* datatype, double rate = 1000)
{
    return {{"core:datatype", datatype}, {"core:version", "1.0.0"}, {"core:sample_rate", rate}};
}

} // namespace

TEST_F(Recording, FormatsByteByByte)
{
    struct row {
        const char* format;
        std::string bytes;
        std::vector<sample> values;
    };
    // 1.5 is 0x3FC00000, −2 is 0xC0000000 (IEEE 754); 0x4000 is a quarter of 2^16, 0x8000 the least of int16.
    const std::string le("\0\0\xC0\x3F\0\0\0\xC0", 8), be("\x3F\xC0\0\0\xC0\0\0\0", 8);
    for (const auto& [format, bytes, values] :
         {row{"cf32_le", le, {{1.5f, -2}}},
          row{"cf32_be", be, {{1.5f, -2}}},
          row{"ci16_le",
              std::string("\0\x40\0\x80\x01\0\xFF\x7F", 8),
              {{0.5f, -1}, {1 / 32768.f, 32767 / 32768.f}}},
          row{"ci16_be",
              std::string("\x40\0\x80\0\0\x01\x7F\xFF", 8),
              {{0.5f, -1}, {1 / 32768.f, 32767 / 32768.f}}},
          row{"ci8", std::string("\x40\x80\x7F\xFF", 4), {{0.5f, -1}, {127 / 128.f, -1 / 128.f}}},
          row{"cu8", std::string("\xC0\0\x80\xFF", 4), {{0.5f, -1}, {0, 127 / 128.f}}}}) {
        recording alone(write("raw", bytes), format);
        EXPECT_EQ(all_of(alone), values) << format;
        recording described(sigmf(global_of(format), json::array(), bytes));
        EXPECT_EQ(all_of(described), values) << format;
        EXPECT_EQ(described.format().name(), format);
    }
}

TEST_F(Recording, NotANumberPassesThrough)
{
    const float nan = std::numeric_limits<float>::quiet_NaN(), inf = std::numeric_limits<float>::infinity();
    recording r(write("raw", bytes_of({{nan, 1}, {2, -inf}})), "cf32_le");
    const auto read = all_of(r);
    EXPECT_TRUE(std::isnan(read[0].real()) && read[0].imag() == 1);
    EXPECT_TRUE(read[1] == sample(2, -inf));
}

TEST_F(Recording, MetadataDataAndBareNameAreTheSameRecording)
{
    const auto meta = sigmf(global_of("ci8"), json::array({{{"core:sample_start", 0}}}), "abcd");
    for (const auto& path : {meta, (folder / "a.sigmf-data").string(), (folder / "a").string()})
        EXPECT_EQ(recording(path).samples(), 2u) << path;
    EXPECT_EQ(recording(meta).sample_rate(), 1000);

    auto global = global_of("ci8");
    global["core:dataset"] = "other.bin";
    const auto other = sigmf(global, json::array(), "ab");
    write("other.bin", "abcdef");
    EXPECT_EQ(recording(other).samples(), 3u);
}

TEST_F(Recording, EveryPieceLengthGivesTheSameSamples)
{
    std::vector<sample> samples;
    for (int k = 0; k < 300000; ++k)
        samples.emplace_back(static_cast<float>(k), static_cast<float>(-k));
    const auto path = write("raw", bytes_of(samples));
    for (std::size_t piece : {7u, 1023u, 131071u, 300000u}) {
        recording r(path, "cf32_le");
        EXPECT_EQ(all_of(r, piece), samples) << piece;
    }
}

TEST_F(Recording, BytesOfNoWholeSampleAreLeftOutAndCounted)
{
    recording r(write("raw", bytes_of({{1, 2}, {3, 4}}) + "abc"), "cf32_le");
    EXPECT_EQ(r.ignored_bytes(), 3u);
    EXPECT_EQ(all_of(r), (std::vector<sample>{{1, 2}, {3, 4}}));
}

TEST_F(Recording, HeadersAndTrailersAreNoSamples)
{
    auto global = global_of("ci8");
    global["core:trailing_bytes"] = 2;
    recording r(sigmf(global,
                      {{{"core:sample_start", 0}, {"core:header_bytes", 3}},
                       {{"core:sample_start", 2}, {"core:header_bytes", 1}}},
                      std::string("hhh\x01\x02\x03\x04h\x05\x06tt", 12)));
    EXPECT_EQ(r.samples(), 3u);
    EXPECT_EQ(all_of(r),
              (std::vector<sample>{{1 / 128.f, 2 / 128.f}, {3 / 128.f, 4 / 128.f}, {5 / 128.f, 6 / 128.f}}));
}

TEST_F(Recording, GapsByCounterTimeAndFrequency)
{
    const auto gap = [&](const json& first, const json& second, double rate = 1000) {
        auto a = first, b = second;
        a["core:sample_start"] = 0;
        b["core:sample_start"] = 500;
        auto global = global_of("ci8", rate);
        if (rate == 0)
            global.erase("core:sample_rate");
        return recording(sigmf(global, json::array({a, b}), std::string(2000, 'a'))).captures().at(1).gap;
    };
    const auto at = [](const char* time) { return json{{"core:datetime", time}}; };
    EXPECT_FALSE(gap({}, {}));
    EXPECT_FALSE(gap({{"core:global_index", 70}}, {{"core:global_index", 570}}));
    EXPECT_TRUE(gap({{"core:global_index", 70}}, {{"core:global_index", 571}}));
    EXPECT_FALSE(gap({{"core:frequency", 1e9}}, {{"core:frequency", 1e9}}));
    EXPECT_TRUE(gap({{"core:frequency", 1e9}}, {{"core:frequency", 1.1e9}}));
    // 500 samples at 1 kHz are half a second.
    EXPECT_FALSE(gap(at("2026-12-01T23:59:59.800Z"), at("2026-12-02T00:00:00.300Z")));
    EXPECT_TRUE(gap(at("2026-12-01T23:59:59.800Z"), at("2026-12-02T00:00:00.305Z")));
    EXPECT_FALSE(gap(at("2026-12-01T06:30:00Z"), at("2026-12-01T06:30:01Z"))) << "whole seconds say no more";
    EXPECT_TRUE(gap(at("2026-12-01T06:30:00Z"), at("2026-12-01T06:30:02Z")));
    EXPECT_TRUE(gap(at("2026-12-01T06:30:00.000Z"), at("2026-12-01T06:30:00.500Z"), 0));
}

TEST_F(Recording, TimeOfSamples)
{
    recording r(sigmf(global_of("ci8"),
                      {{{"core:sample_start", 0}},
                       {{"core:sample_start", 100}, {"core:datetime", "2024-02-28T23:59:59.5Z"}},
                       {{"core:sample_start", 700}, {"core:datetime", "2024-03-01T02:00:00.25+02:00"}}},
                      std::string(2000, 'a')));
    EXPECT_EQ(r.time_of(99), "");
    EXPECT_EQ(r.time_of(100), "2024-02-28T23:59:59.500Z");
    EXPECT_EQ(r.time_of(600), "2024-02-29T00:00:00.000Z"); // a leap year
    EXPECT_EQ(r.time_of(700), "2024-03-01T00:00:00.250Z");
    EXPECT_EQ(r.time_of(999), "2024-03-01T00:00:00.549Z");
}

TEST_F(Recording, RefusalsNameFileAndField)
{
    const std::string data(8, 'a');
    const auto with = [&](const char* field, const json& value) {
        auto global = global_of("ci8");
        global[field] = value;
        return refusal(sigmf(global, json::array(), data));
    };
    struct row {
        std::string said, wanted;
    };
    const auto captures = [&](const json& list) { return refusal(sigmf(global_of("ci8"), list, data)); };
    for (const auto& [said, wanted] :
         {row{with("core:datatype", "rf32_le"), "a.sigmf-meta: core:datatype: 'rf32_le' is no format"},
          row{with("core:datatype", 7), "a.sigmf-meta: core:datatype: a string is wanted, got 7"},
          row{with("core:num_channels", 2), "core:num_channels: a recording of 1 channel is wanted, got 2"},
          row{with("core:sample_rate", -1), "core:sample_rate"},
          row{with("core:sample_rate", "fast"), "core:sample_rate: a finite number is wanted, got \"fast\""},
          row{with("core:dataset", "../b"), "core:dataset"},
          row{with("core:metadata_only", true), "core:metadata_only"},
          row{with("core:sha512", "12"), "core:sha512: 128 hexadecimal digits"},
          row{with("core:trailing_bytes", 9), "more than the 8 bytes"},
          row{with("halfplane:set", 12), "halfplane:set"},
          row{captures(json::array({1})), "captures[0]: an object is wanted, got 1"},
          row{captures(json::array({json::object()})), "captures[0]: core:sample_start is missing"},
          row{captures(json::array({{{"core:sample_start", -1}}})), "captures[0]: core:sample_start"},
          row{captures({{{"core:sample_start", 0}}, {{"core:sample_start", 4}}}),
              "holds 4 samples: is it complete?"},
          row{captures({{{"core:sample_start", 2}}, {{"core:sample_start", 2}}}),
              "captures[1]: core:sample_start"},
          row{captures({{{"core:sample_start", 0}, {"core:datetime", "2026-02-30T00:00:00Z"}}}),
              "captures[0]: core:datetime: a moment"},
          row{refusal(write("b.sigmf-meta", "{\"global\": {\n\"core:datatype\": ,}}")), "line 2"},
          row{refusal(write("c.sigmf-meta", "[]")), "c.sigmf-meta: field \"global\" is missing"},
          row{refusal((folder / "none.sigmf-meta").string()), "none.sigmf-meta: No such file"},
          row{refusal((folder / "none").string()), "none: No such file"},
          row{refusal((folder / "raw").string(), "cf32"), "'cf32' is no format"},
          row{refusal(write("empty", ""), "cf32_le"), "no sample in it"},
          row{refusal(write("raw", data)), "say their format"},
          row{refusal(folder.string(), "ci8"), "not a file"},
          row{refusal(sigmf(global_of("ci8"), json::array(), data), "ci8"), "says the format itself"},
          row{refusal(sigmf(global_of("ci8"), json::array(), data), "", 250), "one sample a symbol"}})
        EXPECT_NE(said.find(wanted), std::string::npos) << said << " | " << wanted;
}

TEST_F(Recording, JudgeCountsWhatAnOfflineCountCounts)
{
    const auto set = align_test::firn12();
    const pattern known("draw:7", set);
    align_test::channel c;
    c.es_n0_db = 14;
    c.gain = std::polar(0.02, 1.0);
    // Lengths below, at and beyond the hold-back, and a last window that ends with the recording.
    for (std::size_t n : {3000u, 4096u, 4097u, 20000u, 123457u}) {
        const auto r = align_test::through(set, align_test::symbols(set, known, 100, n), c);
        aligner align(set, known);
        const auto alone = align_test::run(align, r);
        recording from(write("raw", bytes_of(r)), "cf32_le");
        judge_options options;
        std::vector<report> reports;
        options.on_report = [&](const report& made, const json&) { reports.push_back(made); };
        const auto judged = judge(from, set, known, options);
        const auto& total = judged.last["total"];
        EXPECT_EQ(total["in"], n);
        EXPECT_EQ(total["pending"], 0u);
        EXPECT_EQ(total["judged"], alone.judged()) << n;
        EXPECT_GT(total["judged"].get<std::uint64_t>(), 0u) << n;
        EXPECT_EQ(total["symbol_errors"], align_test::errors(set, alone, 0, n)) << n;
        EXPECT_TRUE(judged.last["final"].get<bool>());
        EXPECT_FALSE(judged.last.contains("time")) << "nothing says when it was";
        EXPECT_EQ(reports.back(), judged.last);
        std::uint64_t in = 0;
        for (const auto& each : reports) {
            const auto& t = each["total"];
            std::uint64_t sum = t["judged"].get<std::uint64_t>() + t["nonfinite"].get<std::uint64_t>() +
                                t["pending"].get<std::uint64_t>();
            for (const auto& cause : t["excluded"])
                sum += cause.get<std::uint64_t>();
            EXPECT_EQ(t["in"], sum);
            EXPECT_GE(sum, in);
            in = sum;
        }
    }
}

TEST_F(Recording, SameRecordingSameReports)
{
    const auto set = align_test::firn12();
    const pattern known("draw:7", set);
    align_test::channel c;
    c.es_n0_db = 14;
    const auto path =
        write("raw", bytes_of(align_test::through(set, align_test::symbols(set, known, 0, 200000), c)));
    std::vector<std::string> runs[2];
    for (auto& run : runs) {
        recording from(path, "cf32_le", 1e4);
        judge_options options;
        options.on_report = [&](const report& made, const json&) { run.push_back(made.dump()); };
        judge(from, set, known, options);
    }
    EXPECT_EQ(runs[0].size(), 20u);
    EXPECT_EQ(runs[0], runs[1]);
}

TEST_F(Recording, GapIsAnOverflowAndTimesAreTheRecordings)
{
    const auto set = align_test::firn12();
    const pattern known("draw:7", set);
    align_test::channel c;
    c.es_n0_db = 20;
    const std::size_t n = 60000, cut = 30000, missing = 777;
    auto sent = align_test::symbols(set, known, 0, n + missing);
    sent.erase(sent.begin() + cut, sent.begin() + cut + missing);
    const auto bytes = bytes_of(align_test::through(set, sent, c));
    const json first = {{"core:sample_start", 0}, {"core:datetime", "2026-12-01T06:30:00.000Z"}};
    // 30,000 symbols at 1 kHz are 30 s; the second capture began 0.777 s late.
    recording from(sigmf(global_of("cf32_le"),
                         {first, {{"core:sample_start", cut}, {"core:datetime", "2026-12-01T06:30:30.777Z"}}},
                         bytes));
    std::vector<report> reports;
    judge_options options;
    options.on_report = [&](const report& made, const json&) { reports.push_back(made); };
    const auto judged = judge(from, set, known, options);
    const auto& excluded = judged.last["total"]["excluded"];
    EXPECT_EQ(excluded["slip"], 0u);
    EXPECT_LE(excluded["overflow"].get<std::uint64_t>(), 64u) << "the mark says where";
    EXPECT_EQ(excluded["signal_lost"], 0u);
    EXPECT_EQ(judged.last["lock"]["state"], "held");
    EXPECT_EQ(judged.last["total"]["slips"], 0u);
    EXPECT_EQ(judged.last["total"]["symbol_errors"], 0u);
    EXPECT_EQ(judged.last["total"]["seconds"], 60.0);
    ASSERT_EQ(reports.size(), 6u);
    EXPECT_EQ(reports[2]["time"], "2026-12-01T06:30:29.999Z");
    EXPECT_EQ(reports[3]["time"], "2026-12-01T06:30:40.776Z");

    // The same samples with nothing that says so: a slip.
    recording plain(sigmf(global_of("cf32_le"), json::array({first}), bytes));
    EXPECT_EQ(judge(plain, set, known, {}).last["total"]["slips"], 1u);
}

TEST_F(Recording, ProgressEndsTheRunAndAnErrorOfTheReceiverOfReportsReachesTheCaller)
{
    const auto set = align_test::firn12();
    const pattern known("draw:7", set);
    const auto path =
        write("raw", bytes_of(align_test::through(set, align_test::symbols(set, known, 0, 300000), {})));
    {
        recording from(path, "cf32_le");
        judge_options options;
        options.progress = [&](std::uint64_t done) { return done == 0; };
        const auto judged = judge(from, set, known, options);
        // Ten questions a second: a fast machine may have read all of it before the second.
        EXPECT_EQ(judged.last["total"]["in"], from.position());
        EXPECT_EQ(judged.complete, from.position() == 300000u);
    }
    {
        recording from(path, "cf32_le");
        judge_options options;
        options.progress = [&](std::uint64_t) { return false; };
        const auto judged = judge(from, set, known, options);
        EXPECT_FALSE(judged.complete);
        EXPECT_EQ(judged.last["total"]["in"], 0u);
    }
    recording from(path, "cf32_le");
    judge_options options;
    options.on_report = [](const report&, const json&) { throw std::runtime_error("disk gone"); };
    EXPECT_THROW(judge(from, set, known, options), std::runtime_error);
}
