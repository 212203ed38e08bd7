// SPDX-License-Identifier: GPL-3.0-or-later
// link_log_impl: writes messages in the publisher's own thread.
#pragma once

#include "halfplane/link/log.h"

#include <gnuradio/halfplane/link_log.h>

#include <mutex>

namespace gr::halfplane {

class link_log_impl final : public link_log
{
public:
    link_log_impl(const std::string& path, std::uint64_t max_bytes);

    std::uint64_t written() const override;
    /// Every publisher's call ends up here, before the scheduler's queue. Messages on `report` are written at
    /// once; all others (the scheduler's own) go the usual way.
    void post(pmt::pmt_t which_port, pmt::pmt_t message) override;

private:
    void keep_carry(const pmt::pmt_t& message);
    void write(const pmt::pmt_t& message);

    mutable std::mutex d_mutex; ///< several publishers may come at once
    ::halfplane::link::report_log d_log;
    bool d_keep_failing = false;
};

} // namespace gr::halfplane
