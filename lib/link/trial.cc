// SPDX-License-Identifier: GPL-3.0-or-later
// trial: symbols become steps of the bets, and frames.
#include "halfplane/link/trial.h"

#include "halfplane/carry.h"

#include <algorithm>
#include <sstream>
#include <stdexcept>

namespace halfplane::link {

namespace {

constexpr std::uint64_t dependent_bits = 256;

verdict_options
bets_of(const error_target& target, const trial_options& options, double confidence, unsigned bits)
{
    verdict_options v;
    v.target = target.rate;
    v.confidence = confidence;
    v.max_excluded = options.max_excluded;
    v.dependence = target.kind == error_kind::fer ? 1 : (dependent_bits + bits - 1) / bits;
    if (options.dependence > 0)
        v.dependence = options.dependence;
    if (target.kind == error_kind::ber)
        v.errors_per_step = bits;
    return v;
}

} // namespace

nlohmann::json trial_state::save() const
{
    nlohmann::json out = {{"frames", carry_writer::document(frames)},
                          {"frame_blocks", carry_writer::document(frame_blocks)}};
    if (bets)
        out["bets"] = bets->save();
    return out;
}

void trial_state::restore(const nlohmann::json& saved)
{
    carry_reader read(saved);
    read("frames", frames);
    frames.restart();
    read("frame_blocks", frame_blocks);
    if (bets)
        bets->restore(saved.at("bets"));
}

trial::trial(const signal_set& set, const trial_options& options, double confidence)
    : d_labels(set.labels().begin(), set.labels().end()),
      d_idle(options.target.empty() && options.frame_symbols == 0)
{
    if (options.frame_symbols > std::uint64_t{1} << 32)
        throw std::invalid_argument("frame_symbols must be at most 2^32, got " +
                                    std::to_string(options.frame_symbols));
    if (!(options.max_excluded >= 0 && options.max_excluded <= 1)) {
        std::ostringstream text;
        text << "max_excluded must lie in 0 … 1, got " << options.max_excluded;
        throw std::invalid_argument(text.str());
    }
    d.frames = frame_counts(options.frame_symbols);
    if (options.target.empty())
        return;
    d.target = parse_error_target(options.target);
    if (d.target->kind == error_kind::fer && options.frame_symbols == 0)
        throw std::invalid_argument("target is '" + options.target + "', but frame_symbols is 0");
    d.bets.emplace(bets_of(*d.target, options, confidence, set.label_bits()));
}

void trial::take_frames(std::uint64_t count, bool in_error)
{
    if (in_error)
        d.frame_blocks.add_error();
    else
        d.frame_blocks.add_clear(count);
    if (d.target && d.target->kind == error_kind::fer)
        d.bets->add(count, in_error);
}

void trial::judged(const std::uint16_t* sent, const std::uint16_t* decided, std::size_t n)
{
    if (d_idle)
        return;
    const auto take = [this](std::uint64_t count, bool in_error) { take_frames(count, in_error); };
    const bool by_symbol = d.bets && d.target->kind != error_kind::fer;
    const bool by_bit = d.target && d.target->kind == error_kind::ber;
    for (std::size_t k = 0; k < n;) {
        const auto wrong =
            static_cast<std::size_t>(std::mismatch(sent + k, sent + n, decided + k).first - sent);
        if (by_symbol)
            d.bets->add(wrong - k, 0);
        d.frames.add_clear(wrong - k, take);
        k = wrong;
        if (k == n)
            break;
        if (by_symbol)
            d.bets->add(1, by_bit ? label_distance(d_labels[sent[k]], d_labels[decided[k]]) : 1);
        d.frames.add_error(take);
        ++k;
    }
}

void trial::left_out(std::size_t cause, std::uint64_t n)
{
    if (!d_idle)
        d.frames.leave_out(
            n, cause, [this](std::uint64_t count, bool in_error) { take_frames(count, in_error); });
}

} // namespace halfplane::link
