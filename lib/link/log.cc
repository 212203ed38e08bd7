// SPDX-License-Identifier: GPL-3.0-or-later
// log: whole lines by write, fdatasync, and truncation where a line did not fit.
#include "halfplane/link/log.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdio>
#include <system_error>

namespace halfplane::link {

namespace {

/// Writes all or says how much of it: 0 and errno where even the first byte failed.
std::size_t write_all(int file, const std::string& text)
{
    std::size_t done = 0;
    while (done < text.size()) {
        const auto n = ::write(file, text.data() + done, text.size() - done);
        if (n > 0)
            done += static_cast<std::size_t>(n);
        else if (n < 0 && errno != EINTR)
            break;
    }
    return done;
}

bool ends_within_a_line(int file, off_t size)
{
    char last = '\n';
    return size > 0 && ::pread(file, &last, 1, size - 1) == 1 && last != '\n';
}

} // namespace

report_log::report_log(std::string path, std::uint64_t max_bytes)
    : d_path(std::move(path)), d_max_bytes(max_bytes)
{
    if (!open())
        d_failed = 0; // no line was lost yet
}

report_log::~report_log()
{
    close();
}

void report_log::close()
{
    if (d_file >= 0)
        ::close(d_file);
    d_file = -1;
}

void report_log::note(const std::string& path, const char* doing, int error)
{
    d_error = path + ": " + doing + ": " + std::generic_category().message(error);
}

bool report_log::fail(const char* doing, int error)
{
    note(d_path, doing, error);
    d_failing = true;
    ++d_failed;
    close();
    return false;
}

bool report_log::open()
{
    // Reading is for the last byte only; a path that can only be written to (a device, a pipe) is opened
    // without.
    d_file = ::open(d_path.c_str(), O_RDWR | O_APPEND | O_CREAT | O_CLOEXEC, 0644);
    if (d_file < 0 && (errno == EACCES || errno == ENXIO))
        d_file = ::open(d_path.c_str(), O_WRONLY | O_APPEND | O_CREAT | O_CLOEXEC, 0644);
    if (d_file < 0)
        return fail("cannot be opened", errno);
    struct stat about {
    };
    const bool regular = ::fstat(d_file, &about) == 0 && S_ISREG(about.st_mode);
    d_torn = regular && ends_within_a_line(d_file, about.st_size);
    d_settings_due |= regular && about.st_size == 0;
    return true;
}

/// Renames the file to the first number that is free and opens a new one. Where the name cannot be changed
/// the file goes on to grow: a log that is too long is better than none.
bool report_log::put_aside()
{
    for (unsigned long k = 1;; ++k) {
        const auto name = d_path + "." + std::to_string(k);
        if (::access(name.c_str(), F_OK) == 0)
            continue;
        if (std::rename(d_path.c_str(), name.c_str()) != 0) {
            note(d_path, "cannot be put aside", errno);
            return true;
        }
        close();
        return open();
    }
}

void report_log::take_settings(report& line)
{
    const auto settings = line.find("settings");
    if (settings == line.end())
        return;
    auto digest = line.value("settings_sha256", std::string());
    if (d_settings.empty() || digest != d_digest) {
        d_settings =
            report{{"schema", "halfplane/settings/1"}, {"settings_sha256", digest}, {"settings", *settings}}
                .dump() +
            '\n';
        d_digest = std::move(digest);
        d_settings_due = true;
    }
    line.erase(settings);
}

std::string report_log::text_of(const report& line) const
{
    return (d_torn ? "\n" : "") + (d_settings_due ? d_settings : "") + line.dump() + '\n';
}

bool report_log::keep(const std::string& carry)
{
    struct stat about {
    };
    if (::stat(d_path.c_str(), &about) == 0 && !S_ISREG(about.st_mode))
        return true;
    const auto path = carry_path(d_path), fresh = path + ".new";
    const int file = ::open(fresh.c_str(), O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0644);
    if (file < 0) {
        note(fresh, "cannot be opened", errno);
        return false;
    }
    const bool whole = write_all(file, carry) == carry.size() && ::fdatasync(file) == 0;
    const int error = errno;
    ::close(file);
    if (whole && std::rename(fresh.c_str(), path.c_str()) == 0)
        return true;
    note(fresh, "cannot be written", whole ? errno : error);
    ::unlink(fresh.c_str());
    return false;
}

bool report_log::write(report line)
{
    take_settings(line);
    if (d_file < 0 && !open())
        return false;
    std::string text = text_of(line);

    struct stat before {
    };
    bool regular = ::fstat(d_file, &before) == 0 && S_ISREG(before.st_mode);
    if (regular && d_max_bytes > 0 && before.st_size > 0 &&
        static_cast<std::uint64_t>(before.st_size) + text.size() > d_max_bytes) {
        if (!put_aside())
            return false;
        text = text_of(line);
        regular = ::fstat(d_file, &before) == 0 && S_ISREG(before.st_mode);
    }
    const std::size_t done = write_all(d_file, text);
    const int error = errno;
    if (done < text.size()) {
        if (done > 0 && regular && ::ftruncate(d_file, before.st_size) != 0)
            return fail("a part of a line could not be taken back", errno); // closed off when opened again
        return fail("cannot be written", error);
    }
    d_torn = d_settings_due = false;
    // EINVAL and EROFS: the file is of a kind that has nothing to synchronise.
    if (::fdatasync(d_file) != 0 && errno != EINVAL && errno != EROFS)
        return fail("cannot be brought to disk", errno);
    ++d_written;
    d_failing = false;
    return true;
}

} // namespace halfplane::link
