// SPDX-License-Identifier: GPL-3.0-or-later
// link_log_impl: writes messages in the publisher's own thread.
#include "link_log_impl.h"

#include <gnuradio/halfplane/report_pmt.h>
#include <gnuradio/io_signature.h>

#include <stdexcept>

namespace gr::halfplane {
namespace {

const pmt::pmt_t& report_port()
{
    static const pmt::pmt_t port = pmt::mp("report");
    return port;
}

} // namespace

link_log::sptr link_log::make(const std::string& path)
{
    return gnuradio::make_block_sptr<link_log_impl>(path);
}

link_log_impl::link_log_impl(const std::string& path)
    : gr::block("link_log", gr::io_signature::make(0, 0, 0), gr::io_signature::make(0, 0, 0)), d_log(path)
{
    if (d_log.failing())
        throw std::invalid_argument("link_log: path is '" + path + "'; " + d_log.last_error());
    message_port_register_in(report_port());
}

std::uint64_t link_log_impl::written() const
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    return d_log.written();
}

void link_log_impl::post(pmt::pmt_t which_port, pmt::pmt_t message)
{
    if (pmt::eqv(which_port, report_port()))
        write(message);
    else
        gr::block::post(which_port, message);
}

void link_log_impl::write(const pmt::pmt_t& message)
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    try {
        const auto line = pmt_to_json(message);
        const bool was_failing = d_log.failing();
        if (!d_log.write(line) && !was_failing)
            d_logger->error("a report is not in the log: {:s}", d_log.last_error());
    } catch (const std::exception& error) {
        d_logger->error("a message is no report: {:s}", error.what());
    }
}

} // namespace gr::halfplane
