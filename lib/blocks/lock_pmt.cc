// SPDX-License-Identifier: GPL-3.0-or-later
// lock_pmt: the status of a lock as a PMT dict and back.
#include "lock_pmt.h"

#include <gnuradio/halfplane/report_pmt.h>

#include <stdexcept>
#include <string>

namespace gr::halfplane {

using ::halfplane::link::lock_state;
using ::halfplane::link::lock_status;

pmt::pmt_t lock_to_pmt(const lock_status& status)
{
    return json_to_pmt({{"state", to_string(status.state)},
                        {"delay", status.delay},
                        {"rotation_deg", status.rotation_deg},
                        {"mirrored", status.mirrored},
                        {"inverted", status.inverted},
                        {"frequency", status.frequency},
                        {"slips", status.slips}});
}

lock_status lock_from_pmt(const pmt::pmt_t& message)
{
    try {
        const auto fields = pmt_to_json(message);
        lock_status status;
        const auto word = fields.at("state").get<std::string>();
        bool known = false;
        for (const auto state :
             {lock_state::searching, lock_state::held, lock_state::doubtful, lock_state::lost})
            if (word == to_string(state)) {
                status.state = state;
                known = true;
            }
        if (!known)
            throw std::invalid_argument("lock: state is '" + word + "'");
        status.delay = fields.at("delay").get<std::uint64_t>();
        status.rotation_deg = fields.at("rotation_deg").get<double>();
        status.mirrored = fields.at("mirrored").get<bool>();
        status.inverted = fields.at("inverted").get<bool>();
        status.frequency = fields.at("frequency").get<double>();
        status.slips = fields.at("slips").get<std::uint64_t>();
        return status;
    } catch (const nlohmann::json::exception& error) {
        throw std::invalid_argument(std::string("lock: ") + error.what());
    }
}

const pmt::pmt_t& lock_key()
{
    static const pmt::pmt_t key = pmt::mp("lock");
    return key;
}

const pmt::pmt_t& pending_key()
{
    static const pmt::pmt_t key = pmt::mp("pending");
    return key;
}

} // namespace gr::halfplane
