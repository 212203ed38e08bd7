// SPDX-License-Identifier: GPL-3.0-or-later
// rx_time: tells from the radio's time tags whether samples went missing in between.
#pragma once

#include <pmt/pmt.h>

#include <cstdint>
#include <optional>

namespace gr::halfplane {

/*!
 * A radio tags its first sample with the time (uint64 seconds, double fraction), and again each time that
 * samples were lost, or that it was retuned. The tag fits when as much time went by as symbols came: within
 * one symbol, or 100 ppm of the time gone by, which covers the clocks of a radio that was told a nominal
 * rate.
 */
class rx_time
{
public:
    /// symbol_rate in Hz; 0 where unknown: then every tag after the first is a jump.
    explicit rx_time(double symbol_rate) : d_symbol_rate(symbol_rate) {}
    /// Whether the tag `value` at symbol `offset` says that samples are missing before it.
    bool jumped(std::uint64_t offset, const pmt::pmt_t& value);

private:
    struct moment {
        std::uint64_t offset, seconds;
        double fraction;
    };
    const double d_symbol_rate;
    std::optional<moment> d_last;
};

} // namespace gr::halfplane
