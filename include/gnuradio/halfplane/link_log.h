// SPDX-License-Identifier: GPL-3.0-or-later
// link_log: reports as JSON lines in a file.
#pragma once

#include <gnuradio/block.h>

#include <cstdint>
#include <memory>
#include <string>

namespace gr::halfplane {

/*!
 * Message port `report` (in): each dict becomes one line of JSON, appended to the file. Its `settings` stand
 * once, on a line ahead: in every file, of every run, and again where they change (halfplane/link/log.h has
 * the form).
 *
 * A message is written before the publisher's call returns, in the publisher's thread. So what was reported
 * was also written, even the final report of a flowgraph that ends: the scheduler's own queue would lose
 * some.
 */
class link_log : virtual public gr::block
{
public:
    using sptr = std::shared_ptr<link_log>;

    /*!
     * \param path file to append to; created where it does not exist
     * \param max_bytes size beyond which the file is put aside as path.1, path.2 …, the highest number the
     * latest; 0: never \throws std::invalid_argument where the file cannot be opened, with the path and the
     * reason
     */
    static sptr make(const std::string& path, std::uint64_t max_bytes = 0);

    /// Reports written so far.
    virtual std::uint64_t written() const = 0;
};

} // namespace gr::halfplane
