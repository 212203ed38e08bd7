// SPDX-License-Identifier: GPL-3.0-or-later
// report_log: whole lines or none, full disks, missing directories, torn ends, and recovery.
#include "halfplane/link/log.h"

#include <gtest/gtest.h>

#include <sys/resource.h>
#include <unistd.h>

#include <csignal>
#include <filesystem>
#include <fstream>

using namespace halfplane::link;
namespace fs = std::filesystem;

namespace {

class Log : public ::testing::Test
{
protected:
    void SetUp() override
    {
        d_folder = fs::temp_directory_path() / ("halfplane-log-" + std::to_string(::getpid()));
        fs::create_directories(d_folder);
    }
    void TearDown() override { fs::remove_all(d_folder); }
    std::string path(const char* name) const { return (d_folder / name).string(); }

    fs::path d_folder;
};

std::vector<std::string> lines_of(const std::string& path)
{
    std::ifstream file(path);
    std::vector<std::string> lines;
    for (std::string line; std::getline(file, line);)
        lines.push_back(line);
    return lines;
}

report numbered(int k)
{
    return {{"sequence", k}, {"text", std::string(200, 'x')}};
}

} // namespace

TEST_F(Log, OneLineAReportAndAppended)
{
    for (int run = 0; run < 2; ++run) {
        report_log log(path("a.jsonl"));
        EXPECT_TRUE(log.write(numbered(2 * run)));
        // On disk when write() returns: another reader sees it while the log is open.
        EXPECT_EQ(lines_of(path("a.jsonl")).size(), static_cast<std::size_t>(2 * run + 1));
        EXPECT_TRUE(log.write(numbered(2 * run + 1)));
        EXPECT_EQ(log.written(), 2u);
        EXPECT_EQ(log.failed(), 0u);
        EXPECT_FALSE(log.failing());
        EXPECT_EQ(log.last_error(), "");
    }
    const auto lines = lines_of(path("a.jsonl"));
    ASSERT_EQ(lines.size(), 4u);
    for (int k = 0; k < 4; ++k)
        EXPECT_EQ(report::parse(lines[static_cast<std::size_t>(k)]), numbered(k));
}

TEST_F(Log, SettingsStandAheadOncePerFileProcessAndChange)
{
    const auto with = [](int k, const char* digest) {
        report r = numbered(k);
        r["settings_sha256"] = digest;
        r["settings"] = {{"window", 7}, {"of", digest}};
        return r;
    };
    const auto said = [](const char* digest) {
        return report{{"schema", "halfplane/settings/1"},
                      {"settings_sha256", digest},
                      {"settings", {{"window", 7}, {"of", digest}}}}
            .dump();
    };
    const auto plain = [](int k, const char* digest) {
        report r = numbered(k);
        r["settings_sha256"] = digest;
        return r.dump();
    };
    {
        report_log log(path("s.jsonl"));
        EXPECT_EQ(log.settings_digest(), "");
        EXPECT_TRUE(log.write(with(0, "a")));
        EXPECT_EQ(log.settings_digest(), "a");
        EXPECT_TRUE(log.write(with(1, "a")));
        EXPECT_TRUE(log.write(report::parse(plain(2, "a")))); // known already
        EXPECT_TRUE(log.write(with(3, "b")));
        EXPECT_EQ(log.written(), 4u);
    }
    report_log log(path("s.jsonl"));
    EXPECT_TRUE(log.write(with(4, "b")));
    EXPECT_EQ(lines_of(path("s.jsonl")),
              (std::vector<std::string>{said("a"),
                                        plain(0, "a"),
                                        plain(1, "a"),
                                        plain(2, "a"),
                                        said("b"),
                                        plain(3, "b"),
                                        said("b"),
                                        plain(4, "b")}));
}

TEST_F(Log, AFileThatGrowsTooLongIsPutAside)
{
    const auto with = [](int k) {
        report r = numbered(k);
        r["settings_sha256"] = "a";
        r["settings"] = {{"window", 7}};
        return r;
    };
    const auto line = numbered(0).dump().size() + 24;
    for (int run = 0; run < 2; ++run) {
        report_log log(path("r.jsonl"), 3 * line + 100);
        for (int k = 0; k < 5; ++k)
            EXPECT_TRUE(log.write(with(5 * run + k)));
        EXPECT_EQ(log.failed(), 0u);
    }
    // All that was ever written, in order, the settings first in each file, none longer than asked for.
    std::vector<int> numbers;
    int files = 0;
    for (const auto& name : {"r.jsonl.1", "r.jsonl.2", "r.jsonl.3", "r.jsonl.4", "r.jsonl.5", "r.jsonl"}) {
        if (!fs::exists(path(name)))
            continue;
        ++files;
        EXPECT_LE(fs::file_size(path(name)), 3 * line + 100) << name;
        const auto lines = lines_of(path(name));
        ASSERT_FALSE(lines.empty());
        EXPECT_EQ(report::parse(lines[0])["schema"], "halfplane/settings/1") << name;
        for (const auto& text : lines)
            if (const auto read = report::parse(text); read.contains("sequence"))
                numbers.push_back(read["sequence"]);
    }
    EXPECT_GE(files, 4);
    ASSERT_EQ(numbers.size(), 10u);
    for (int k = 0; k < 10; ++k)
        EXPECT_EQ(numbers[static_cast<std::size_t>(k)], k);
}

TEST_F(Log, ALineLongerThanTheLimitIsWrittenWhole)
{
    report_log log(path("long.jsonl"), 10);
    EXPECT_TRUE(log.write(numbered(0)));
    EXPECT_TRUE(log.write(numbered(1)));
    EXPECT_EQ(lines_of(path("long.jsonl.1")), std::vector<std::string>{numbered(0).dump()});
    EXPECT_EQ(lines_of(path("long.jsonl")), std::vector<std::string>{numbered(1).dump()});
}

TEST_F(Log, SettingsAreSaidAgainWhereTheFirstAttemptFailed)
{
    fs::create_symlink("/dev/full", path("full.jsonl"));
    report_log log(path("full.jsonl"));
    report r = numbered(0);
    r["settings_sha256"] = "a";
    r["settings"] = {{"window", 7}};
    EXPECT_FALSE(log.write(r));
    fs::remove(path("full.jsonl"));
    EXPECT_TRUE(log.write(r));
    const auto lines = lines_of(path("full.jsonl"));
    ASSERT_EQ(lines.size(), 2u);
    EXPECT_EQ(report::parse(lines[0])["schema"], "halfplane/settings/1");
}

TEST_F(Log, AFullDiskIsSaidCountedAndSurvived)
{
    // /dev/full answers every write with "no space left"; the link then points to a disk with room again.
    fs::create_symlink("/dev/full", path("full.jsonl"));
    report_log log(path("full.jsonl"));
    EXPECT_FALSE(log.write(numbered(0)));
    EXPECT_FALSE(log.write(numbered(1)));
    EXPECT_TRUE(log.failing());
    EXPECT_EQ(log.failed(), 2u);
    EXPECT_EQ(log.written(), 0u);
    EXPECT_EQ(log.last_error(), path("full.jsonl") + ": cannot be written: No space left on device");
    fs::remove(path("full.jsonl"));
    fs::create_symlink(path("room.jsonl"), path("full.jsonl"));
    EXPECT_TRUE(log.write(numbered(2)));
    EXPECT_FALSE(log.failing());
    EXPECT_EQ(log.failed(), 2u);
    EXPECT_EQ(lines_of(path("room.jsonl")), std::vector<std::string>{numbered(2).dump()});
}

TEST_F(Log, ALineThatFitsInPartIsTakenBack)
{
    // A limit on the file's size stands for a disk with room for half a line.
    ::signal(SIGXFSZ, SIG_IGN);
    struct rlimit before {
    };
    ASSERT_EQ(::getrlimit(RLIMIT_FSIZE, &before), 0);
    report_log log(path("part.jsonl"));
    EXPECT_TRUE(log.write(numbered(0)));
    const auto whole = fs::file_size(path("part.jsonl"));
    struct rlimit tight = before;
    tight.rlim_cur = whole + whole / 2;
    ASSERT_EQ(::setrlimit(RLIMIT_FSIZE, &tight), 0);
    EXPECT_FALSE(log.write(numbered(1)));
    EXPECT_EQ(fs::file_size(path("part.jsonl")), whole);
    EXPECT_EQ(log.last_error(), path("part.jsonl") + ": cannot be written: File too large");
    ASSERT_EQ(::setrlimit(RLIMIT_FSIZE, &before), 0);
    EXPECT_TRUE(log.write(numbered(2)));
    EXPECT_EQ(lines_of(path("part.jsonl")),
              (std::vector<std::string>{numbered(0).dump(), numbered(2).dump()}));
}

TEST_F(Log, AnUnwritablePathIsSaidAndTriedAgain)
{
    report_log log(path("missing/b.jsonl"));
    EXPECT_TRUE(log.failing());
    EXPECT_EQ(log.failed(), 0u);
    EXPECT_EQ(log.last_error(), path("missing/b.jsonl") + ": cannot be opened: No such file or directory");
    EXPECT_FALSE(log.write(numbered(0)));
    EXPECT_EQ(log.failed(), 1u);
    fs::create_directory(path("missing"));
    EXPECT_TRUE(log.write(numbered(1)));
    EXPECT_EQ(lines_of(path("missing/b.jsonl")).size(), 1u);

    report_log folder(path("missing"));
    EXPECT_FALSE(folder.write(numbered(0)));
    EXPECT_EQ(folder.last_error(), path("missing") + ": cannot be opened: Is a directory");
}

TEST_F(Log, ATornEndIsClosedOff)
{
    std::ofstream(path("torn.jsonl")) << numbered(0).dump() << "\n{\"sequ";
    report_log log(path("torn.jsonl"));
    EXPECT_TRUE(log.write(numbered(1)));
    const auto lines = lines_of(path("torn.jsonl"));
    ASSERT_EQ(lines.size(), 3u);
    EXPECT_EQ(lines[1], "{\"sequ");
    EXPECT_EQ(lines[2], numbered(1).dump());
}

TEST_F(Log, ADeviceThatCannotBeSynchronisedTakesLines)
{
    report_log log("/dev/null");
    EXPECT_TRUE(log.write(numbered(0)));
}
