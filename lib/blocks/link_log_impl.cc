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

/// Without the settings where the log knows them: they may be longer than the report, and turning them into
/// text would be in vain.
pmt::pmt_t without_known_settings(const pmt::pmt_t& message, const std::string& digest)
{
    static const pmt::pmt_t settings = pmt::mp("settings"), key = pmt::mp("settings_sha256");
    const bool known = !digest.empty() && pmt::is_dict(message) &&
                       pmt::eqv(pmt::dict_ref(message, key, pmt::PMT_NIL), pmt::mp(digest));
    return known ? pmt::dict_delete(message, settings) : message;
}

} // namespace

link_log::sptr link_log::make(const std::string& path, std::uint64_t max_bytes)
{
    return gnuradio::make_block_sptr<link_log_impl>(path, max_bytes);
}

link_log_impl::link_log_impl(const std::string& path, std::uint64_t max_bytes)
    : gr::block("link_log", gr::io_signature::make(0, 0, 0), gr::io_signature::make(0, 0, 0)),
      d_log(path, max_bytes)
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

void link_log_impl::keep_carry(const pmt::pmt_t& message)
{
    static const pmt::pmt_t key = pmt::mp("carry");
    const auto carry = pmt::is_dict(message) ? pmt::dict_ref(message, key, pmt::PMT_NIL) : pmt::PMT_NIL;
    if (!pmt::is_u8vector(carry))
        return;
    std::size_t length = 0;
    const auto* bytes = pmt::u8vector_elements(carry, length);
    const bool kept = d_log.keep(std::string(reinterpret_cast<const char*>(bytes), length));
    if (!kept && !d_keep_failing)
        d_logger->error("the state to resume from is that of an earlier report: {:s}", d_log.last_error());
    d_keep_failing = !kept;
}

void link_log_impl::write(const pmt::pmt_t& message)
{
    const std::lock_guard<std::mutex> lock(d_mutex);
    try {
        keep_carry(message);
        auto line = pmt_to_json(without_known_settings(message, d_log.settings_digest()));
        const bool was_failing = d_log.failing();
        if (!d_log.write(std::move(line)) && !was_failing)
            d_logger->error("a report is not in the log: {:s}", d_log.last_error());
        else if (was_failing && !d_log.failing())
            d_logger->warn("the log goes on; {:d} reports are missing", d_log.failed());
    } catch (const std::exception& error) {
        d_logger->error("a message is no report: {:s}", error.what());
    }
}

} // namespace gr::halfplane
