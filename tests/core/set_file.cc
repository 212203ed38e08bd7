// SPDX-License-Identifier: GPL-3.0-or-later
// set_file: reading and writing JSON and CSV, every refusal with its whole message, and damaged files.
#include "halfplane/set_file.h"

#include <gtest/gtest.h>

#include <cstdint>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <functional>
#include <sstream>
#include <string>

using namespace halfplane;

namespace {

signal_set json(const std::string& text)
{
    std::istringstream in(text);
    return read_set_json(in, "a.json");
}

signal_set csv(const std::string& text)
{
    std::istringstream in(text);
    return read_set_csv(in, "a.csv");
}

std::string refusal(const std::function<void()>& f)
{
    try {
        f();
    } catch (const invalid_set& e) {
        return e.what();
    }
    return "accepted";
}

std::string json_refusal(const std::string& text)
{
    return refusal([&] { json(text); });
}
std::string csv_refusal(const std::string& text)
{
    return refusal([&] { csv(text); });
}

/// A set file of two points whose second one is `point`.
std::string second(const std::string& point)
{
    return R"({"points": [{"label": "0", "i": 1, "q": 0}, )" + point + "]}";
}

void expect_same(const signal_set& a, const signal_set& b)
{
    EXPECT_EQ(a.points(), b.points());
    EXPECT_EQ(a.labels(), b.labels());
    EXPECT_EQ(a.label_bits(), b.label_bits());
    EXPECT_EQ(a.priors(), b.priors());
    EXPECT_EQ(a.uniform(), b.uniform());
}

/// Deterministic 64-bit draws (SplitMix64).
struct draws {
    std::uint64_t state;
    std::uint64_t operator()()
    {
        std::uint64_t z = state += 0x9e3779b97f4a7c15u;
        z = (z ^ z >> 30) * 0xbf58476d1ce4e5b9u;
        z = (z ^ z >> 27) * 0x94d049bb133111ebu;
        return z ^ z >> 31;
    }
    double unit() { return static_cast<double>((*this)() >> 11) * 0x1p-53; }
};

signal_set random_set(std::size_t m, bool priors, std::uint64_t seed)
{
    draws next{seed};
    std::vector<complex> points(m);
    std::vector<double> p(m);
    double sum = 0;
    for (std::size_t k = 0; k < m; ++k) {
        points[k] = {(next.unit() - 0.5) * 1e3, (next.unit() - 0.5) * 1e-3};
        sum += p[k] = 0.1 + next.unit();
    }
    for (double& value : p)
        value /= sum;
    auto set = signal_set::with_natural_labels(points, "random");
    return priors ? set.with_priors(p) : set;
}

} // namespace

TEST(SetFile, JsonSaysWhatTheSetIs)
{
    const auto set = json(R"({"name": "three", "note": "a note", "points": [
        {"label": "00", "i": 0, "q": 0, "p": 0.5}, {"label": "01", "i": 2.0, "q": 0, "p": 0.25},
        {"q": 2e0, "p": 0.25, "label": "10", "i": -0.0}]})");
    EXPECT_EQ(set.name(), "three");
    EXPECT_EQ(set.note(), "a note");
    EXPECT_EQ(set.size(), 3u);
    EXPECT_EQ(set.points()[2], complex(0, 2));
    EXPECT_EQ(set.label_string(2), "10");
    EXPECT_DOUBLE_EQ(set.es(), 2.0);
    EXPECT_EQ(json(R"({"points": [{"label": "0", "i": 1, "q": 0}, {"label": "1", "i": -1, "q": 0}]})").name(),
              "a");
}

TEST(SetFile, CsvSaysWhatTheSetIs)
{
    const auto set =
        csv("\xef\xbb\xbflabel, i, q, p\r\n00,0,0,0.5\r\n\r\n 01 , +2 , 0 , .25\r\n10,0,2e0,0.25");
    EXPECT_EQ(set.size(), 3u);
    EXPECT_EQ(set.points()[1], complex(2, 0));
    EXPECT_EQ(set.priors()[0], 0.5);
    EXPECT_EQ(set.name(), "a");
    EXPECT_TRUE(csv("label,i,q\n0,1,0\n1,-1,0\n").uniform());
}

TEST(SetFile, WhatIsWrittenReadsBackToTheSameDoubles)
{
    for (std::size_t m : {2u, 3u, 12u, 100u, 4096u})
        for (bool priors : {false, true}) {
            const auto set = random_set(m, priors, m);
            std::ostringstream as_json, as_csv;
            write_set_json(as_json, set);
            write_set_csv(as_csv, set);
            expect_same(json(as_json.str()), set);
            expect_same(csv(as_csv.str()), set);
            EXPECT_EQ(json(as_json.str()).name(), "random");
        }
    // Text that needs escapes.
    std::ostringstream out;
    write_set_json(out, random_set(2, false, 1).renamed("a \"quoted\"\nname", "\\ ü"));
    EXPECT_EQ(json(out.str()).name(), "a \"quoted\"\nname");
    EXPECT_EQ(json(out.str()).note(), "\\ ü");
}

TEST(SetFile, TheExampleSetLoads)
{
    const auto set = load_set(HALFPLANE_SOURCE_DIR "/examples/sets/firn-12.json");
    EXPECT_EQ(set.name(), "firn-12");
    EXPECT_EQ(set.size(), 12u);
    EXPECT_EQ(set.label_bits(), 4u);
}

TEST(SetFile, JsonRefusals)
{
    EXPECT_EQ(json_refusal("{\"points\": [\n  {\"label\": \"0\",, }"),
              "a.json: not JSON: parse error at line 2, column 17: syntax error while parsing object key - "
              "unexpected "
              "','; expected string literal");
    EXPECT_EQ(json_refusal("[]"), "a.json: must be a JSON object with \"points\", got []");
    EXPECT_EQ(json_refusal("{}"), "a.json: field \"points\" is missing");
    EXPECT_EQ(json_refusal(R"({"points": 3})"), "a.json: field \"points\": must be an array, got 3");
    EXPECT_EQ(json_refusal(R"({"name": 3, "points": []})"),
              "a.json: field \"name\": must be a string, got 3");
    EXPECT_EQ(json_refusal(R"({"note": [], "points": []})"),
              "a.json: field \"note\": must be a string, got []");
    EXPECT_EQ(json_refusal(R"({"size": 2, "points": []})"),
              "a.json: unknown field \"size\": 2; known are name, note, points");
    EXPECT_EQ(json_refusal(R"({"points": [], "points": []})"),
              "a.json: field \"points\" is given twice in one object");
    EXPECT_EQ(json_refusal(R"({"points": []})"), "a.json: a set needs at least 2 points, got 0");
    EXPECT_EQ(json_refusal(R"({"points": [{"label": "0", "i": 1, "q": 0}]})"),
              "a.json: a set needs at least 2 points, got 1");
    EXPECT_EQ(json_refusal(second("7")), "a.json: point 1: must be an object with label, i, q, got 7");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": 1})")), "a.json: point 1: field \"q\" is missing");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "q": 1})")), "a.json: point 1: field \"i\" is missing");
    EXPECT_EQ(json_refusal(second(R"({"i": 2, "q": 1})")), "a.json: point 1: field \"label\" is missing");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": "2", "q": 1})")),
              "a.json: point 1: field \"i\": must be a number, got \"2\"");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": null, "q": 1})")),
              "a.json: point 1: field \"i\": must be a number, got null");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": 2, "q": 1e999})")),
              "a.json: not JSON: number overflow parsing '1e999'");
    EXPECT_NE(
        json_refusal(second(R"({"label": "1", "i": NaN, "q": 1})")).find("parse error at line 1, column"),
        std::string::npos);
    EXPECT_EQ(json_refusal(second(R"({"label": 1, "i": 2, "q": 1})")),
              "a.json: point 1: field \"label\": must be a string, got 1");
    EXPECT_EQ(json_refusal(second(R"({"label": "", "i": 2, "q": 1})")),
              "a.json: point 1: field \"label\": must be 1 to 12 characters 0 or 1, got \"\"");
    EXPECT_EQ(json_refusal(second(R"({"label": "0x1", "i": 2, "q": 1})")),
              "a.json: point 1: field \"label\": must be 1 to 12 characters 0 or 1, got \"0x1\"");
    EXPECT_EQ(json_refusal(second(R"({"label": "0000000000001", "i": 2, "q": 1})")),
              "a.json: point 1: field \"label\": must be 1 to 12 characters 0 or 1, got \"0000000000001\"");
    EXPECT_EQ(
        json_refusal(second(R"({"label": "01", "i": 2, "q": 1})")),
        "a.json: point 1: field \"label\": all labels must have one length; point 0 has 1 bits, got \"01\"");
    EXPECT_EQ(json_refusal(second(R"({"label": "0", "i": 2, "q": 1})")),
              "a.json: point 1: field \"label\": \"0\" is already the label of point 0");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": 1.0, "q": -0.0})")),
              "a.json: point 1: the point (1, -0) is already given by point 0");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": 2, "q": 1, "r": 3})")),
              "a.json: point 1: unknown field \"r\": 3; known are label, i, q, p");
    EXPECT_EQ(json_refusal(second(R"({"label": "1", "i": 2, "q": 1, "p": 0.5})")),
              "a.json: point 1: field \"p\": give it at every point or at none; point 0 has none");
    const auto priors = [](const std::string& a, const std::string& b) {
        return R"({"points": [{"label": "0", "i": 1, "q": 0, "p": )" + a +
               R"(}, {"label": "1", "i": -1, "q": 0)" + (b.empty() ? "" : ", \"p\": " + b) + "}]}";
    };
    EXPECT_EQ(json_refusal(priors("0.5", "")),
              "a.json: point 1: field \"p\": give it at every point or at none; point 0 has one");
    EXPECT_EQ(json_refusal(priors("1", "0")),
              "a.json: point 1: field \"p\": must be a positive number, got 0");
    EXPECT_EQ(json_refusal(priors("1.5", "-0.5")),
              "a.json: point 1: field \"p\": must be a positive number, got -0.5");
    EXPECT_EQ(json_refusal(priors("0.5", "0.25")),
              "a.json: priors must sum to 1 within 1e-06, they sum to 0.75");
    EXPECT_EQ(json_refusal(priors("0.5", "true")),
              "a.json: point 1: field \"p\": must be a number, got true");
    EXPECT_EQ(json_refusal(priors("0.5", "0.5000009")), "accepted");
    EXPECT_EQ(json_refusal("{\"a\": {\"b\": {\"c\": {\"d\": 1}}}}"),
              "a.json: nested deeper than a set file is");
    EXPECT_EQ(json_refusal("{\"name\": \"\xff\", \"points\": []}")
                  .find("a.json: not JSON: parse error at line 1, column 11"),
              0u);
}

TEST(SetFile, CsvRefusals)
{
    EXPECT_EQ(csv_refusal(""), "a.csv: empty; a table with the header label,i,q is expected");
    EXPECT_EQ(csv_refusal("i,q\n1,0\n"),
              "a.csv: line 1: the header must be label,i,q or label,i,q,p, got \"i,q\"");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n"), "a.csv: a set needs at least 2 points, got 1");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,2\n"), "a.csv: line 3: must have 3 fields, got 2: \"1,2\"");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,2,3,4\n"),
              "a.csv: line 3: must have 3 fields, got 4: \"1,2,3,4\"");
    EXPECT_EQ(csv_refusal("label,i,q\n\n0,1,0\n1,2x,0\n"),
              "a.csv: line 4: field \"i\": must be a finite number, got \"2x\"");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,2,nan\n"),
              "a.csv: line 3: field \"q\": must be a finite number, got \"nan\"");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,2,-inf\n"),
              "a.csv: line 3: field \"q\": must be a finite number, got \"-inf\"");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,1e999,0\n"),
              "a.csv: line 3: field \"i\": must be a finite number, got \"1e999\"");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,,0\n"),
              "a.csv: line 3: field \"i\": must be a finite number, got \"\"");
    EXPECT_EQ(csv_refusal("label,i,q,p\n0,1,0,1\n1,2,0,0\n"),
              "a.csv: line 3: field \"p\": must be a positive number, got 0");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n0,2,0\n"),
              "a.csv: line 3: field \"label\": \"0\" is already the label of line 2");
    EXPECT_EQ(csv_refusal("label,i,q\n0,1,0\n1,1,0\n"),
              "a.csv: line 3: the point (1, 0) is already given by line 2");
    EXPECT_EQ(
        csv_refusal("label,i,q\n0,1,0\n01,2,0\n"),
        "a.csv: line 3: field \"label\": all labels must have one length; line 2 has 1 bits, got \"01\"");
    std::string many = "label,i,q\n";
    for (unsigned k = 0; k < 4096; ++k) {
        for (int bit = 11; bit >= 0; --bit)
            many += k >> bit & 1 ? '1' : '0';
        many += "," + std::to_string(k) + ",0\n";
    }
    EXPECT_EQ(csv_refusal(many), "accepted");
    EXPECT_EQ(csv_refusal(many + "000000000000,-1,0\n"), "a.csv: line 4098: a set has at most 4096 points");
}

TEST(SetFile, PathsAndNames)
{
    EXPECT_EQ(refusal([] { load_set("absent.json"); }),
              "no set file \"absent.json\"; a named set is written like psk:8 or std:38.211/16qam");
    EXPECT_EQ(refusal([] { load_set("pks:8"); }),
              "no constellation is named \"pks:8\"; the closest name is psk:8");
    EXPECT_EQ(refusal([] { load_set("std:38.211/16qm"); }),
              "no constellation is named \"std:38.211/16qm\"; the closest name is std:38.211/16qam");
    EXPECT_EQ(refusal([] { load_set("/"); }), "/: is a folder, no set file");
    EXPECT_EQ(refusal([] { load_set(""); }),
              "no set file \"\"; a named set is written like psk:8 or std:38.211/16qam");
    EXPECT_EQ(load_set("psk:8").size(), 8u);

    const auto folder = std::filesystem::path(::testing::TempDir());
    const auto write = [&](const char* name, const std::string& text) {
        std::ofstream(folder / name, std::ios::binary) << text;
        return (folder / name).string();
    };
    EXPECT_EQ(load_set(write("halfplane-pair.csv", "label,i,q\n0,1,0\n1,-1,0\n")).name(), "halfplane-pair");
    EXPECT_EQ(load_set(write("halfplane-plain", "label,i,q\n0,1,0\n1,-1,0\n")).size(), 2u);
    EXPECT_EQ(load_set(write("halfplane-text", " " + second(R"({"label": "1", "i": 2, "q": 0})"))).size(),
              2u);
    const auto broken = write("halfplane-broken.json", "{");
    EXPECT_EQ(refusal([&] { load_set(broken); }).find(broken + ": not JSON: parse error at line 1, column 2"),
              0u);
    const auto large = write("halfplane-large.csv", std::string((std::size_t{8} << 20) + 1, ' '));
    EXPECT_EQ(refusal([&] { load_set(large); }), large + ": larger than 8 MiB, no set file");
}

// Whatever bytes a file holds: either a set or a refusal of one line that starts with the file's name.
class DamagedFile : public ::testing::Test
{
protected:
    std::size_t accepted = 0, refused = 0;

    template <typename Read>
    void take(Read read, const std::string& text, const std::string& source)
    {
        try {
            const signal_set set = read(text);
            ++accepted;
            ASSERT_GE(set.size(), 2u);
            ASSERT_GT(set.d_min(), 0);
        } catch (const invalid_set& e) {
            ++refused;
            const std::string message = e.what();
            ASSERT_EQ(message.find(source + ": "), 0u) << message;
            ASSERT_EQ(message.find('\n'), std::string::npos) << message;
        }
    }

    template <typename Read>
    void damage(Read read, const std::string& whole, const std::string& source, std::uint64_t seed)
    {
        for (std::size_t length = 0; length < whole.size(); ++length)
            take(read, whole.substr(0, length), source);
        draws next{seed};
        const std::string favourites = "{}[]\",:0123456789.eE+-\n\r\t \\unulltruefalseplabeliq\xff";
        for (int round = 0; round < 20000; ++round) {
            std::string text = whole;
            for (std::uint64_t edits = 1 + next() % 4; edits > 0; --edits) {
                const std::size_t at = next() % text.size();
                const char c =
                    next() % 4 ? favourites[next() % favourites.size()] : static_cast<char>(next());
                switch (next() % 4) {
                case 0:
                    text[at] = c;
                    break;
                case 1:
                    text.insert(at, 1 + next() % 3, c);
                    break;
                case 2:
                    text.erase(at, 1 + next() % 8);
                    break;
                default:
                    text.insert(at, text.substr(next() % text.size(), next() % 40));
                }
                if (text.empty())
                    text = "x";
            }
            take(read, text, source);
        }
        std::printf("%s: %zu accepted, %zu refused\n", source.c_str(), accepted, refused);
        EXPECT_GT(accepted, 100u); // harmless edits, of the name or of digits
        EXPECT_GT(refused, 10000u);
    }
};

TEST_F(DamagedFile, Json)
{
    std::ostringstream out;
    write_set_json(out, random_set(5, true, 9));
    damage(json, out.str(), "a.json", 11);
}

TEST_F(DamagedFile, Csv)
{
    std::ostringstream out;
    write_set_csv(out, random_set(5, false, 9));
    damage(csv, out.str(), "a.csv", 12);
}
