// SPDX-License-Identifier: GPL-3.0-or-later
// link_watch_impl: hands symbols and what is known of them to the reporter, and its reports to the message
// port.
#include "link_watch_impl.h"

#include "checks.h"
#include "lock_pmt.h"

#include <gnuradio/halfplane/report_pmt.h>
#include <gnuradio/io_signature.h>

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace gr::halfplane {
namespace {

using ::halfplane::reference_t;

const pmt::pmt_t& report_port()
{
    static const pmt::pmt_t port = pmt::mp("report");
    return port;
}

bool from_receiver(const std::string& decisions)
{
    if (decisions != "own" && decisions != "receiver")
        refuse_word("link_watch", "decisions", decisions, "one of own, receiver is wanted");
    return decisions == "receiver";
}

::halfplane::link::watch_options options_of(const std::string& pattern,
                                            std::uint64_t window,
                                            double confidence,
                                            double symbol_rate,
                                            const std::string& decisions,
                                            const std::string& target,
                                            std::uint64_t frame_symbols,
                                            double max_excluded,
                                            const std::string& resume,
                                            bool explain)
{
    ::halfplane::link::watch_options options;
    options.pattern = pattern;
    options.window = checked("link_watch", "window", window, window >= 1, "at least 1 symbol is wanted");
    options.confidence = checked("link_watch",
                                 "confidence",
                                 confidence,
                                 confidence > 0 && confidence < 1,
                                 "a number inside (0, 1) is wanted");
    options.symbol_rate = checked("link_watch",
                                  "symbol_rate",
                                  symbol_rate,
                                  std::isfinite(symbol_rate) && symbol_rate >= 0,
                                  "a finite number ≥ 0 is wanted");
    options.receiver_decisions = from_receiver(decisions);
    options.trial = {target, frame_symbols, max_excluded};
    options.resume = resume;
    options.explain = explain;
    return options;
}

} // namespace

link_watch::sptr link_watch::make(const ::halfplane::signal_set& set,
                                  const std::string& pattern,
                                  std::uint64_t window,
                                  double confidence,
                                  double symbol_rate,
                                  const std::string& decisions,
                                  const std::string& target,
                                  std::uint64_t frame_symbols,
                                  double max_excluded,
                                  const std::string& resume,
                                  bool explain)
{
    return gnuradio::make_block_sptr<link_watch_impl>(set,
                                                      pattern,
                                                      window,
                                                      confidence,
                                                      symbol_rate,
                                                      decisions,
                                                      target,
                                                      frame_symbols,
                                                      max_excluded,
                                                      resume,
                                                      explain);
}

link_watch_impl::link_watch_impl(const ::halfplane::signal_set& set,
                                 const std::string& pattern,
                                 std::uint64_t window,
                                 double confidence,
                                 double symbol_rate,
                                 const std::string& decisions,
                                 const std::string& target,
                                 std::uint64_t frame_symbols,
                                 double max_excluded,
                                 const std::string& resume,
                                 bool explain)
    : gr::sync_block(
          "link_watch",
          from_receiver(decisions)
              ? gr::io_signature::make3(3, 3, sizeof(gr_complex), sizeof(reference_t), sizeof(std::int16_t))
              : gr::io_signature::make2(2, 2, sizeof(gr_complex), sizeof(reference_t)),
          gr::io_signature::make(0, 0, 0)),
      d_reporter(set,
                 options_of(pattern,
                            window,
                            confidence,
                            symbol_rate,
                            decisions,
                            target,
                            frame_symbols,
                            max_excluded,
                            resume,
                            explain),
                 {0.1, [this](const ::halfplane::link::report& made) { publish(made); }})
{
    d_settings = json_to_pmt(d_reporter.settings());
    message_port_register_out(report_port());
    const pmt::pmt_t input = pmt::mp("input");
    message_port_register_in(input);
    set_msg_handler(input, [this](const pmt::pmt_t& message) { take_input(message); });
}

/// The worker publishes through this object: it ends first.
link_watch_impl::~link_watch_impl()
{
    d_reporter.stop();
}

std::string link_watch_impl::report() const
{
    const auto latest = d_reporter.latest();
    return latest ? latest->dump() : std::string();
}

bool link_watch_impl::start()
{
    d_reporter.start();
    return true;
}

bool link_watch_impl::stop()
{
    d_reporter.stop();
    if (d_reporter.failures() > 0)
        d_logger->error("{:d} reports could not be made; the last: {:s}",
                        d_reporter.failures(),
                        d_reporter.last_failure());
    return true;
}

void link_watch_impl::publish(const ::halfplane::link::report& made)
{
    static const pmt::pmt_t settings = pmt::mp("settings"), carry = pmt::mp("carry"),
                            cloud = pmt::mp("cloud");
    auto message = pmt::dict_add(json_to_pmt(made), settings, d_settings);
    if (const auto& recent = d_reporter.recent_samples(); !recent.empty())
        message = pmt::dict_add(message, cloud, pmt::init_c32vector(recent.size(), recent.data()));
    // Of large sets the state is long: it may take a tenth of the time, and goes out with the last report in
    // any case.
    const auto began = std::chrono::steady_clock::now();
    if (began >= d_carry_due || made.contains("final")) {
        const auto text = d_reporter.carry();
        const auto* bytes = reinterpret_cast<const std::uint8_t*>(text.data());
        message = pmt::dict_add(message, carry, pmt::init_u8vector(text.size(), bytes));
        const auto now = std::chrono::steady_clock::now();
        d_carry_due = now + 9 * (now - began);
    }
    message_port_pub(report_port(), message);
}

void link_watch_impl::take_input(const pmt::pmt_t& message)
{
    try {
        const auto fields = pmt_to_json(message);
        d_reporter.set_input({fields.at("es_n0_db").get<double>(),
                              fields.value("es_n0_db_se", 0.0),
                              fields.value("source", std::string("declared")) == "measured"});
    } catch (const std::exception& error) {
        d_logger->error("a message on `input` is not understood: {:s}", error.what());
    }
}

void link_watch_impl::take_tag(const gr::tag_t& tag)
{
    try {
        if (pmt::eqv(tag.key, lock_key()))
            d_reporter.set_lock(lock_from_pmt(tag.value));
        else if (pmt::eqv(tag.key, pending_key()))
            d_reporter.set_pending(pmt::to_uint64(tag.value));
    } catch (const std::exception& error) {
        d_logger->error("a tag at symbol {:d} is not understood: {:s}", tag.offset, error.what());
    }
}

int link_watch_impl::work(int noutput_items, gr_vector_const_void_star& in, gr_vector_void_star&)
{
    const auto* samples = static_cast<const gr_complex*>(in[0]);
    const auto* reference = static_cast<const reference_t*>(in[1]);
    const auto* decided = in.size() > 2 ? static_cast<const std::uint16_t*>(in[2]) : nullptr;
    const std::uint64_t first = nitems_read(0);

    std::vector<gr::tag_t> tags;
    get_tags_in_window(tags, 1, 0, static_cast<std::uint64_t>(noutput_items));
    std::sort(tags.begin(), tags.end(), gr::tag_t::offset_compare);

    std::size_t position = 0;
    const auto feed_until = [&](std::size_t end) {
        if (end > position)
            d_reporter.add(samples + position,
                           reference + position,
                           decided ? decided + position : nullptr,
                           end - position);
        position = end;
    };
    try {
        for (const auto& tag : tags) {
            feed_until(static_cast<std::size_t>(tag.offset - first));
            take_tag(tag);
        }
        feed_until(static_cast<std::size_t>(noutput_items));
    } catch (const std::invalid_argument& error) {
        d_logger->error("the stream ends here: {:s}", error.what());
        return WORK_DONE;
    }
    return noutput_items;
}

} // namespace gr::halfplane
