// SPDX-License-Identifier: GPL-3.0-or-later
// aligner: search, hold, doubt and loss; every symbol leaves with exactly one code.
#include "halfplane/link/aligner.h"

#include "align_fit.h"
#include "align_local.h"
#include "align_search.h"
#include "align_split.h"
#include "align_track.h"

#include <algorithm>
#include <array>
#include <optional>
#include <stdexcept>
#include <string>
#include <utility>

namespace halfplane::link {

namespace {

/// Raw samples kept: what a search looks back on, what is held back, and room for a piece.
constexpr std::size_t memory_of_samples = 32768;
/// How far a split may lie before the block in which suspicion first rose.
constexpr std::uint64_t split_margin = 2 * tracker::weighed;
/// How far back a doubt may begin.
constexpr std::uint64_t longest_onset = 1024;
static_assert(memory_of_samples >= search::longest_look + aligner::holdback + tracker::longest_chunk);

/// Agreement beyond chance, in standard deviations, without which a finding is no lock.
constexpr double convincing = 7, still_there = 4;

bool finite(sample a)
{
    return std::isfinite(a.real()) && std::isfinite(a.imag());
}

} // namespace

struct aligner::impl {
    impl(const signal_set& set_, const pattern& known_, aligner_options o)
        : set(set_), known(known_), ref(set, known), reader(known), decider(set), options(o),
          rotations(rotation_order(set)), raw(memory_of_samples), fitted(memory_of_samples),
          corrected(memory_of_samples), codes(memory_of_samples), track(set, o.memory), local(ref),
          finder(make_search(ref, decider))
    {
    }

    const signal_set set;
    const pattern known;
    reference ref;
    pattern::reader reader;
    const kernels::point_decider decider;
    const aligner_options options;
    const unsigned rotations;

    ring<sample> raw, fitted, corrected; // as received; by the running fit; as it goes out
    ring<reference_t> codes;
    std::uint64_t taken = 0, done = 0, written = 0;

    tracker track;
    local_search local;
    std::unique_ptr<search> finder;

    lock_status status;
    std::vector<lock_event> events;
    alignment where;
    turning_gain standing;             // correction::held
    std::uint64_t onset = 0;           // first symbol of the doubt
    std::optional<std::uint64_t> mark; // symbol before which samples are known to be missing
    exclusion cause = exclusion::before_lock;

    void enter(lock_state s, std::uint64_t symbol)
    {
        status.state = s;
        events.push_back({symbol, status});
    }

    // ---- without a lock ----

    void pass_unlocked()
    {
        for (; done < taken; ++done) {
            corrected[done] = raw[done];
            codes[done] = code(cause);
        }
        if (const auto found = finder->look(raw, taken))
            if (const auto f = verified(*found))
                lock(found->where, *f, taken);
    }

    std::optional<fit> verified(const finding& found)
    {
        const auto f = fit_stretch(ref, raw, found.where, found.begin, found.end);
        if (!f)
            return std::nullopt;
        const std::uint64_t all = found.end - found.begin;
        const auto score = [&](std::uint64_t last) {
            return agreement(ref, decider, raw, found.where, *f, found.end - std::min(all, last), found.end);
        };
        if (score(4096) < convincing || score(1024) < still_there)
            return std::nullopt;
        return f;
    }

    void lock(const alignment& a, const fit& f, std::uint64_t symbol)
    {
        where = a;
        const complex gain = gain_at(f, symbol);
        track.start(gain, f.frequency, f.coefficient, static_cast<double>(f.symbols));
        set_status(gain, f.frequency);
        // A frequency that cannot be told from none is none: frozen, it would turn for ever.
        const bool turning = std::abs(f.frequency) > 4 * f.frequency_sd;
        standing = {turning ? gain : f.standing_gain, turning ? f.frequency : 0, symbol};
        ref.seek(reader, where, done);
        enter(lock_state::held, symbol);
    }

    static complex gain_at(const fit& f, std::uint64_t symbol)
    {
        return f.gain * std::polar(1.0, 2 * M_PI * f.frequency * static_cast<double>(symbol - f.end));
    }

    void set_status(complex gain, double frequency)
    {
        const double part = 2 * M_PI / rotations;
        const long turns = std::lround(std::arg(gain) / part);
        const long n = static_cast<long>(rotations);
        status.rotation_deg = 360.0 * static_cast<double>(((turns % n) + n) % n) / rotations;
        status.mirrored = where.mirrored;
        status.inverted = where.inverted;
        status.frequency = where.mirrored ? -frequency : frequency;
        status.delay = ref.delay(where.offset);
    }

    // ---- with a lock ----

    void pass_chunk(std::size_t count)
    {
        std::array<sample, tracker::longest_chunk> z, y;
        std::array<std::uint16_t, tracker::longest_chunk> sent;
        fetch(raw, where.mirrored, done, done + count, z.data());
        ref.next(reader, where, count, sent.data());
        track.correct(z.data(), sent.data(), ref.points().data(), count, y.data());
        for (std::size_t k = 0; k < count; ++k) {
            fitted[done + k] = y[k];
            codes[done + k] = static_cast<reference_t>(sent[k]);
        }
        if (options.mode == correction::held)
            standing.undo(z.data(), done, count, y.data());
        else if (options.mode == correction::off)
            turning_gain{std::polar(1.0, status.rotation_deg * M_PI / 180)}.undo(
                z.data(), done, count, y.data());
        for (std::size_t k = 0; k < count; ++k)
            corrected[done + k] = finite(z[k]) ? y[k] : raw[done + k];
        done += count;
        track.advance(status.state == lock_state::doubtful);
    }

    void pass_locked(std::size_t least)
    {
        while (taken - done >= least && taken > done) {
            const std::uint64_t begin = done;
            pass_chunk(std::min<std::uint64_t>(track.chunk(), taken - done));
            if (status.state == lock_state::held) {
                if (track.suspicion() == 0)
                    onset = begin; // the last block that looked sound begins here or before
                if (track.suspicion() > tracker::doubtful)
                    doubt(onset, exclusion::slip);
            } else {
                resolve();
            }
        }
    }

    void doubt(std::uint64_t from, exclusion why)
    {
        // Suspicion may have grown slowly; what lies further back has been judged by the pattern as it was.
        onset = std::max(from, done > longest_onset ? done - longest_onset : 0);
        cause = why;
        enter(lock_state::doubtful, onset);
        local.restart(done, track.coefficient());
        finder->restart(done);
    }

    /// One look for the pattern while in doubt.
    void resolve()
    {
        if (const auto near = local.look(fitted, where, done)) {
            if (near->shift == 0) {
                regain(near->ratio, near->coefficient, near->symbols);
                hold(done);
                return;
            }
            alignment a = where;
            const auto shift = static_cast<std::int64_t>(ref.step()) * near->shift;
            const auto modulus = static_cast<std::int64_t>(ref.modulus());
            a.offset = (where.offset + static_cast<std::uint64_t>((shift % modulus + modulus) % modulus)) %
                       ref.modulus();
            slip(a, near->ratio, near->coefficient, near->symbols);
            return;
        }
        const auto found = finder->look(raw, done);
        const auto f = found ? verified(*found) : std::nullopt;
        if (!f)
            return;
        const complex ratio = gain_at(*f, done) / track.gain();
        if (found->where == where) {
            regain(ratio, f->coefficient, f->symbols);
            hold(done);
        } else {
            slip(found->where, ratio, f->coefficient, f->symbols);
        }
    }

    void hold(std::uint64_t symbol)
    {
        mark.reset();
        enter(lock_state::held, symbol);
    }

    /// Takes up a gain found after a doubt where it is not the one that was frozen.
    void regain(complex ratio, double coefficient, std::size_t symbols)
    {
        const double rho2 = std::max(coefficient * coefficient, 1e-6);
        const double spread = std::sqrt((1 / rho2 - 1) / static_cast<double>(symbols));
        if (std::abs(ratio - 1.0) > 0.3 + 3 * spread)
            track.start(track.gain() * ratio, track.frequency(), coefficient, static_cast<double>(symbols));
        else
            track.trust(coefficient);
    }

    void slip(const alignment& to, complex ratio, double coefficient, std::size_t symbols)
    {
        std::uint64_t from = end_of_old();
        const std::uint64_t begin = mark ? std::max(*mark, written) : split_begin();
        std::uint64_t until = to.mirrored == where.mirrored
                                  ? first_of_new(ref, fitted, to, track.coefficient(), begin, done)
                                  : done;
        if (until < from) // both fit there: which of them held cannot be told
            std::swap(from, until);

        where = to;
        std::vector<std::uint16_t> sent(done - until);
        ref.read(where, until, sent.size(), sent.data());
        for (std::uint64_t k = from; k < until; ++k)
            codes[k] = code(cause);
        for (std::uint64_t k = until; k < done; ++k)
            codes[k] = static_cast<reference_t>(sent[k - until]);

        regain(ratio, coefficient, symbols);
        set_status(track.gain(), track.frequency());
        status.slips += cause == exclusion::slip;
        ref.seek(reader, where, done);
        hold(until);
    }

    std::uint64_t split_begin() const
    {
        return std::max(written, onset > split_margin ? onset - split_margin : 0);
    }

    /// Where the old alignment ended: a mark says so, if the samples do not say it ended earlier.
    std::uint64_t end_of_old()
    {
        const std::uint64_t until = mark ? std::max(*mark, written) : done;
        if (onset >= until)
            return until;
        return last_of_old(ref, fitted, where, track.coefficient(), std::min(split_begin(), until), until);
    }

    void lose()
    {
        const std::uint64_t from = end_of_old();
        cause = mark ? exclusion::overflow : exclusion::signal_lost;
        for (std::uint64_t k = from; k < done; ++k)
            codes[k] = code(cause);
        mark.reset();
        enter(lock_state::lost, from);
    }

    void overflow()
    {
        const bool locked = status.state == lock_state::held || status.state == lock_state::doubtful;
        if (locked)
            pass_locked(1);
        if (status.state == lock_state::held)
            doubt(taken, exclusion::overflow);
        if (locked) {
            mark = taken;
            cause = exclusion::overflow;
            local.restart(taken, track.coefficient());
        }
        finder->restart(taken);
    }

    // ---- the stream ----

    static std::unique_ptr<search> make_search(reference& ref, const kernels::point_decider& decider)
    {
        if (ref.by_bits())
            return make_parity_search(ref, decider);
        return make_correlation_search(ref);
    }

    void advance(bool all)
    {
        if (status.state == lock_state::held || status.state == lock_state::doubtful)
            pass_locked(all ? 1 : track.chunk());
        if (status.state == lock_state::searching || status.state == lock_state::lost)
            pass_unlocked();
    }

    std::size_t emit(std::uint64_t until, sample* out, reference_t* reference)
    {
        // A doubt is over, one way or the other, before its first symbol leaves.
        if (status.state == lock_state::doubtful && until + split_margin > onset)
            lose();
        const std::size_t count = until > written ? until - written : 0;
        for (std::size_t k = 0; k < count; ++k, ++written) {
            out[k] = corrected[written];
            reference[k] = codes[written];
        }
        return count;
    }
};

aligner::aligner(const signal_set& set, const pattern& known, aligner_options options)
{
    if (options.memory < 16)
        throw std::invalid_argument("aligner: memory must be at least 16 symbols, got " +
                                    std::to_string(options.memory));
    d = std::make_unique<impl>(set, known, options);
}

aligner::~aligner() = default;
aligner::aligner(aligner&&) noexcept = default;

std::size_t aligner::process(const std::complex<float>* in,
                             std::size_t count,
                             std::complex<float>* out,
                             reference_t* reference)
{
    std::size_t produced = 0;
    while (count > 0) {
        // Cut at the same symbols whatever the calls: the outcome must not depend on how a scheduler hands
        // over.
        const std::size_t piece =
            std::min<std::size_t>(count, tracker::longest_chunk - d->taken % tracker::longest_chunk);
        for (std::size_t k = 0; k < piece; ++k)
            d->raw[d->taken + k] = in[k];
        d->taken += piece;
        in += piece;
        count -= piece;
        if (d->taken % tracker::longest_chunk == 0)
            d->advance(false);
        if (d->taken > holdback)
            produced += d->emit(d->taken - holdback, out + produced, reference + produced);
    }
    return produced;
}

std::size_t aligner::finish(std::complex<float>* out, reference_t* reference)
{
    d->advance(true);
    return d->emit(d->taken, out, reference);
}

void aligner::mark_overflow()
{
    d->advance(false);
    d->overflow();
}

std::vector<lock_event> aligner::take_events()
{
    return std::exchange(d->events, {});
}
const lock_status& aligner::status() const noexcept
{
    return d->status;
}
std::uint64_t aligner::taken() const noexcept
{
    return d->taken;
}
std::uint64_t aligner::written() const noexcept
{
    return d->written;
}

} // namespace halfplane::link
