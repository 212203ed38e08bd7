// SPDX-License-Identifier: GPL-3.0-or-later
// log: reports as JSON lines on disk, one whole line each or none.
#pragma once

#include "halfplane/link/watch.h"

#include <cstdint>
#include <string>

namespace halfplane::link {

/*!
 * Appends one line of JSON a report. write() returns when the line has been handed to the disk (fdatasync),
 * so it survives the end of the process and, where the disk keeps its promises, the loss of power; it takes
 * as long as the disk takes, so call it from a thread that may wait (reporter's `on_report`). On files that
 * cannot be synchronised (pipes, character devices) the line is written only.
 *
 * A line that cannot be written in full (disk full, path not writable) is taken back and counted, never
 * thrown: a report carries the totals of the run, so the next one makes good for it, and the gap shows in
 * `sequence`. The file is opened anew by its path for the line after a failure. A torn line that an earlier
 * process left at the end of the file is closed by a line feed first. Not thread-safe.
 */
class report_log
{
public:
    /// Opens or creates the file. Where that fails, lines are tried all the same: see failed() and
    /// last_error().
    explicit report_log(std::string path);
    ~report_log();
    report_log(const report_log&) = delete;
    report_log& operator=(const report_log&) = delete;

    /// Whether the line is on disk.
    bool write(const report& line);

    const std::string& path() const noexcept { return d_path; }
    std::uint64_t written() const noexcept { return d_written; }
    std::uint64_t failed() const noexcept { return d_failed; }
    /// Whether the last attempt failed; true turns to false with the first line that goes through again.
    bool failing() const noexcept { return d_failing; }
    /// What the last failure was: "report.jsonl: No space left on device". Empty while there was none.
    const std::string& last_error() const noexcept { return d_error; }

private:
    bool open();
    void close();
    bool fail(const char* doing, int error);

    std::string d_path;
    int d_file = -1;
    bool d_torn = false; ///< the file ends within a line
    bool d_failing = false;
    std::uint64_t d_written = 0, d_failed = 0;
    std::string d_error;
};

} // namespace halfplane::link
