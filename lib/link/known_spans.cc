// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans: two rings, one of samples held back, one of what is known of them and of symbols to come.
#include "halfplane/link/known_spans.h"

#include <algorithm>
#include <sstream>
#include <stdexcept>

namespace halfplane::link {

namespace {

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    std::ostringstream text;
    (text << ... << parts);
    throw std::invalid_argument(text.str());
}

std::size_t power_of_two(std::size_t at_least)
{
    std::size_t size = 1;
    while (size < at_least)
        size *= 2;
    return size;
}

/// Calls f(pointer into the ring, how many, how many before) for the pieces in which `count` items from
/// number `first` lie.
template <typename T, typename F>
void in_pieces(std::vector<T>& ring, std::uint64_t first, std::size_t count, F&& f)
{
    for (std::size_t done = 0; done < count;) {
        const auto place = static_cast<std::size_t>((first + done) & (ring.size() - 1));
        const std::size_t n = std::min(count - done, ring.size() - place);
        f(ring.data() + place, n, done);
        done += n;
    }
}

reference_t code_of(const known_span& span, std::size_t k)
{
    return static_cast<reference_t>(span.indices[k] | (span.decoded ? decoded_flag : 0));
}

bool same_index(reference_t a, reference_t b)
{
    return ((a ^ b) & ~decoded_flag) == 0;
}

} // namespace

known_spans::known_spans(const signal_set& set, std::size_t hold_back)
    : d_points(set.size()), d_hold_back(hold_back)
{
    if (hold_back > longest_hold_back)
        refuse(
            "known_spans: hold_back is ", hold_back, "; at most ", longest_hold_back, " symbols are wanted");
    d_samples.resize(power_of_two(hold_back));
    d_codes.assign(power_of_two(hold_back + horizon), live_code);
}

void known_spans::check(const known_span& span) const
{
    if (span.indices.empty())
        refuse("the span at symbol ", span.first_symbol, " is empty");
    for (std::size_t k = 0; k < span.indices.size(); ++k)
        if (span.indices[k] >= d_points)
            refuse("index ",
                   k,
                   " of the span at symbol ",
                   span.first_symbol,
                   " is ",
                   span.indices[k],
                   ": the set has ",
                   d_points,
                   " points");
}

void known_spans::add(const known_span& span)
{
    check(span);
    ++d_counts.spans;
    const std::uint64_t size = span.indices.size(), first = span.first_symbol;
    // Of the span, symbols begin … end can be placed. Differences only: `first` may be as large as it likes.
    const std::uint64_t begin = first < d_written ? std::min(d_written - first, size) : 0;
    const std::uint64_t limit = d_taken + horizon;
    const std::uint64_t end = first < limit ? std::min(limit - first, size) : 0;
    d_counts.late += begin;
    d_counts.early += size - end;
    if (begin == end)
        return;

    const auto count = static_cast<std::size_t>(end - begin);
    bool agrees = true;
    in_pieces(d_codes, first + begin, count, [&](const reference_t* code, std::size_t n, std::size_t done) {
        for (std::size_t k = 0; k < n; ++k)
            agrees &= code[k] == live_code || same_index(code[k], code_of(span, begin + done + k));
    });
    if (!agrees) {
        ++d_counts.conflicts;
        return;
    }
    in_pieces(d_codes, first + begin, count, [&](reference_t* code, std::size_t n, std::size_t done) {
        for (std::size_t k = 0; k < n; ++k)
            if (code[k] == live_code || !span.decoded)
                code[k] = code_of(span, begin + done + k);
    });
    d_known_end = std::max(d_known_end, first + end);
}

/// The oldest `count` samples of the hold-back.
void known_spans::release(std::size_t count, std::complex<float>* out)
{
    in_pieces(
        d_samples, d_written, count, [&](const std::complex<float>* held, std::size_t n, std::size_t done) {
            std::copy(held, held + n, out + done);
        });
}

/// What is known of the next `count` symbols that go out; their places are free again afterwards.
void known_spans::tell(std::size_t count, reference_t* reference)
{
    const auto marked = static_cast<std::size_t>(
        std::min<std::uint64_t>(count, d_known_end > d_written ? d_known_end - d_written : 0));
    in_pieces(d_codes, d_written, marked, [&](reference_t* code, std::size_t n, std::size_t done) {
        std::copy(code, code + n, reference + done);
        std::fill(code, code + n, live_code);
    });
    std::fill(reference + marked, reference + count, live_code);

    std::size_t unknown = count - marked, decoded = 0;
    for (std::size_t k = 0; k < marked; ++k) {
        unknown += reference[k] == live_code;
        decoded += reference[k] >= decoded_flag;
    }
    d_counts.live += unknown;
    d_counts.decoded += decoded;
    d_counts.known += count - unknown - decoded;
    d_written += count;
}

std::size_t known_spans::process(const std::complex<float>* in,
                                 std::size_t count,
                                 std::complex<float>* out,
                                 reference_t* reference)
{
    const auto held = static_cast<std::size_t>(d_taken - d_written);
    const std::size_t leaving = held + count > d_hold_back ? held + count - d_hold_back : 0;
    const std::size_t from_held = std::min(leaving, held), straight = leaving - from_held;
    release(from_held, out);
    std::copy(in, in + straight, out + from_held);
    in_pieces(d_samples,
              d_taken + straight,
              count - straight,
              [&](std::complex<float>* place, std::size_t n, std::size_t done) {
                  std::copy_n(in + straight + done, n, place);
              });
    d_taken += count;
    tell(leaving, reference);
    return leaving;
}

std::size_t known_spans::finish(std::size_t room, std::complex<float>* out, reference_t* reference)
{
    const auto count = static_cast<std::size_t>(std::min<std::uint64_t>(room, d_taken - d_written));
    release(count, out);
    tell(count, reference);
    return count;
}

} // namespace halfplane::link
