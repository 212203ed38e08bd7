// SPDX-License-Identifier: GPL-3.0-or-later
// rx_time: tells from the radio's time tags whether samples went missing in between.
#include "rx_time.h"

#include <algorithm>
#include <cmath>

namespace gr::halfplane {

bool rx_time::jumped(std::uint64_t offset, const pmt::pmt_t& value)
{
    if (!pmt::is_tuple(value) || pmt::length(value) != 2 || !pmt::is_uint64(pmt::tuple_ref(value, 0)) ||
        !pmt::is_real(pmt::tuple_ref(value, 1)))
        return false; // some other block's tag of that name
    const moment now{
        offset, pmt::to_uint64(pmt::tuple_ref(value, 0)), pmt::to_double(pmt::tuple_ref(value, 1))};
    const auto last = d_last;
    d_last = now;
    if (!last)
        return false;
    if (d_symbol_rate <= 0)
        return true;
    const double elapsed = static_cast<double>(now.seconds) - static_cast<double>(last->seconds) +
                           (now.fraction - last->fraction);
    const double expected = static_cast<double>(now.offset - last->offset) / d_symbol_rate;
    const double tolerance = std::max(1 / d_symbol_rate, 1e-4 * std::abs(expected));
    return std::abs(elapsed - expected) > tolerance;
}

} // namespace gr::halfplane
