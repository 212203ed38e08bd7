// SPDX-License-Identifier: GPL-3.0-or-later
// bit_tally: compared byte by byte, and the report.
#include "halfplane/link/bit_tally.h"

#include "halfplane/link/sha256.h"
#include "refuse.h"
#include "report_parts.h"

#include <cmath>

namespace halfplane::link {

bit_tally::bit_tally(bit_tally_options options) : d_options(std::move(options))
{
    const auto& o = d_options;
    if (!(o.confidence > 0 && o.confidence < 1))
        refuse("confidence must lie between 0 and 1, got ", o.confidence);
    if (o.frame_bits > std::uint64_t{1} << 32)
        refuse("frame_bits must be at most 2^32, got ", o.frame_bits);
    if (!(o.max_excluded >= 0 && o.max_excluded <= 1))
        refuse("max_excluded must lie in 0 … 1, got ", o.max_excluded);
    d_total.frames = d_before.frames = frame_counts(o.frame_bits);
    if (!o.target.empty()) {
        d_target = parse_error_target(o.target);
        if (d_target->kind == error_kind::ser)
            refuse("target is '", o.target, "': there are bits and frames here, no symbols");
        if (d_target->kind == error_kind::fer && o.frame_bits == 0)
            refuse("target is '", o.target, "', but frame_bits is 0");
        verdict_options v;
        v.target = d_target->rate;
        v.confidence = o.confidence;
        v.max_excluded = o.max_excluded;
        v.dependence = d_target->kind == error_kind::fer ? 1 : o.dependence;
        d_bets.emplace(v);
    }
    d_digest = sha256(settings().dump());
}

nlohmann::json bit_tally::settings() const
{
    nlohmann::json s = {{"of", "bits"}, {"confidence", d_options.confidence}, {"packed", d_options.packed}};
    if (d_options.frame_bits > 0)
        s["frame_bits"] = d_options.frame_bits;
    if (d_target) {
        s["target"] = d_options.target;
        s["max_excluded"] = d_options.max_excluded;
        s["dependence"] = d_options.dependence;
    }
    return s;
}

void bit_tally::take_frames(std::uint64_t count, bool in_error)
{
    if (in_error)
        d_frame_blocks.add_error();
    else
        d_frame_blocks.add_clear(count);
    if (d_target && d_target->kind == error_kind::fer)
        d_bets->add(count, in_error);
}

void bit_tally::add_clear(std::uint64_t bits)
{
    d_total.bits += bits;
    d_blocks.add_clear(bits);
    if (d_target && d_target->kind == error_kind::ber)
        d_bets->add(bits, 0);
    d_total.frames.add_clear(bits, [this](std::uint64_t count, bool wrong) { take_frames(count, wrong); });
}

void bit_tally::add_bit(bool wrong)
{
    if (!wrong)
        return add_clear(1);
    ++d_total.bits;
    ++d_total.bit_errors;
    d_blocks.add_error();
    if (d_target && d_target->kind == error_kind::ber)
        d_bets->add(1, 1);
    d_total.frames.add_error([this](std::uint64_t count, bool in_error) { take_frames(count, in_error); });
}

void bit_tally::leave_out()
{
    ++d_total.no_bit;
    d_total.frames.leave_out(
        1, 0, [this](std::uint64_t count, bool in_error) { take_frames(count, in_error); });
}

void bit_tally::add(const std::uint8_t* sent, const std::uint8_t* received, std::size_t bytes)
{
    const std::uint64_t bits = d_options.packed ? 8 : 1;
    std::uint64_t clear = 0; // of a run without errors that is not counted yet
    for (std::size_t k = 0; k < bytes; ++k) {
        const unsigned wrong = sent[k] ^ received[k];
        if (wrong == 0 && (d_options.packed || sent[k] < 2)) {
            clear += bits;
            continue;
        }
        add_clear(clear);
        clear = 0;
        if (d_options.packed) {
            for (unsigned bit = 8; bit-- > 0;)
                add_bit(wrong >> bit & 1);
        } else if (sent[k] > 1 || received[k] > 1) {
            leave_out();
        } else {
            add_bit(true);
        }
    }
    add_clear(clear);
}

void bit_tally::skip(std::size_t bytes)
{
    d_total.delay += std::uint64_t{bytes} * (d_options.packed ? 8 : 1);
}

report bit_tally::part(const counts& since) const
{
    const run_intervals ends{
        d_blocks.dispersion().value_or(1), d_options.confidence, d_frame_blocks.dispersion().value_or(1)};
    const auto share = [](std::uint64_t k, std::uint64_t n) {
        return static_cast<double>(k) / static_cast<double>(n);
    };
    const auto bits = d_total.bits - since.bits, errors = d_total.bit_errors - since.bit_errors;
    report out = {{"bits", bits}, {"bit_errors", errors}};
    if (bits > 0)
        put_interval(out, "ber", share(errors, bits), ends.ser(errors, bits));
    if (d_options.frame_bits > 0) {
        const auto frames = d_total.frames.frames - since.frames.frames,
                   wrong = d_total.frames.frame_errors - since.frames.frame_errors;
        out["frames"] = frames;
        out["frame_errors"] = wrong;
        if (frames > 0)
            put_interval(out, "fer", share(wrong, frames), ends.fer(wrong, frames));
        out["frames_excluded"] = {{"no_bit", d_total.frames.excluded[0] - since.frames.excluded[0]}};
    }
    return out;
}

report bit_tally::make_report(bool final)
{
    report out = {
        {"schema", "halfplane/report/1"}, {"version", HALFPLANE_VERSION}, {"settings_sha256", d_digest}};
    out["time"] = d_options.clock ? d_options.clock() : utc_now();
    out["sequence"] = d_sequence++;
    if (final)
        out["final"] = true;
    out["confidence"] = d_options.confidence;
    report window = {{"first_bit", d_before.bits + d_before.delay + d_before.no_bit}};
    window.update(part(d_before));
    out["window"] = std::move(window);
    counts none;
    none.frames = frame_counts(d_options.frame_bits);
    auto total = part(none);
    total["in"] = d_total.bits + d_total.delay + d_total.no_bit;
    total["judged"] = d_total.bits;
    total["excluded"] = {{"delay", d_total.delay}, {"no_bit", d_total.no_bit}};
    if (const auto d = d_blocks.dispersion())
        total["dispersion"] = *d;
    if (const auto d = d_frame_blocks.dispersion())
        total["frame_dispersion"] = *d;
    out["total"] = std::move(total);
    if (d_target) {
        const bool by_frame = d_target->kind == error_kind::fer;
        auto said = verdict_of(*d_target,
                               *d_bets,
                               by_frame ? d_total.frames.all_excluded() : d_total.no_bit,
                               d_options.frame_bits);
        if (said.contains("symbols_to_go")) {
            said["bits_to_go"] = said["symbols_to_go"];
            said.erase("symbols_to_go");
        }
        out["verdict"] = std::move(said);
    }
    d_before = d_total;
    return out;
}

} // namespace halfplane::link
