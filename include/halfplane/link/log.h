// SPDX-License-Identifier: GPL-3.0-or-later
// log: reports as JSON lines on disk, one whole line each or none.
#pragma once

#include "halfplane/link/watch.h"

#include <cstdint>
#include <string>

namespace halfplane::link {

/*!
 * Appends one line of JSON a report. A report may carry the `settings` it was made under; in the file they
 * stand once, on a line of their own ahead of the first report of a file, of a process, and of a report whose
 * `settings_sha256` is another than that of the report before:
 *
 *     {"schema": "halfplane/settings/1", "settings_sha256": …, "settings": {…}}
 *
 * Such a line and the report behind it are written together or not at all, and only reports are counted.
 *
 * A file that would grow beyond `max_bytes` is put aside first: as `path.1`, the next one as `path.2` and so
 * on, the highest number the latest. One report is never split, so a file is longer than that where one line
 * is.
 *
 * write() returns when the line has been handed to the disk (fdatasync),
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
    /// last_error(). \param max_bytes size beyond which the file is put aside; 0: never
    explicit report_log(std::string path, std::uint64_t max_bytes = 0);
    ~report_log();
    report_log(const report_log&) = delete;
    report_log& operator=(const report_log&) = delete;

    /// Whether the line is on disk.
    bool write(report line);
    /*!
     * Beside the log: the state from which a later run goes on (watch::carry()), as path.carry, whole or as
     * it was. To be called ahead of write(), so that nothing that is in the log is missing from it. Nothing
     * is kept beside pipes and devices. Whether it is on disk; see last_error().
     */
    bool keep(const std::string& carry);
    static std::string carry_path(const std::string& log) { return log + ".carry"; }
    /// Of the settings that are known: a report under the same may come without them. Empty at first.
    const std::string& settings_digest() const noexcept { return d_digest; }

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
    bool put_aside();
    void take_settings(report& line);
    void note(const std::string& path, const char* doing, int error);
    std::string text_of(const report& line) const;
    bool fail(const char* doing, int error);

    std::string d_path;
    std::uint64_t d_max_bytes;
    int d_file = -1;
    bool d_torn = false;              ///< the file ends within a line
    std::string d_digest, d_settings; ///< of the latest report that had some; the line that says them
    bool d_settings_due = true;       ///< they stand ahead of the next report
    bool d_failing = false;
    std::uint64_t d_written = 0, d_failed = 0;
    std::string d_error;
};

} // namespace halfplane::link
