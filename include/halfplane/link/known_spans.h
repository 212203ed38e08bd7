// SPDX-License-Identifier: GPL-3.0-or-later
// known_spans: a reference for part of a stream of live traffic, from spans that may become known afterwards.
#pragma once

#include "halfplane/signal_set.h"
#include "halfplane/symbol_code.h"

#include <complex>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace halfplane::link {

/// Consecutive symbols of which somebody says what was sent.
struct known_span {
    std::uint64_t first_symbol; ///< place in the stream put in, from 0
    std::vector<std::uint16_t> indices;
    bool decoded = false; ///< known only because the receiver decoded it well; else known in advance
};

/*!
 * Symbols that went out: known + decoded + live = written, always. Of the spans handed in: `spans` of them
 * were taken, `conflicts` contradicted what stood there before; symbols that could not be placed are `late`
 * where they had gone out already, `early` where they lie beyond the horizon.
 */
struct span_counts {
    std::uint64_t known = 0, decoded = 0, live = 0;
    std::uint64_t spans = 0, conflicts = 0, late = 0, early = 0;
};

/*!
 * One sample in, one sample out, `hold_back` symbols later: out sample, and what is known of it by then: an
 * index (known in advance), an index with decoded_flag, or live_code. The constant delay is what gives a
 * receiver the time to find a preamble or check a frame; it must exceed the longest frame and all that the
 * receiver buffers.
 */
class known_spans
{
public:
    static constexpr std::size_t longest_hold_back = std::size_t{1} << 24;
    /// How far beyond the newest sample a span is kept, in symbols; what lies further is counted as `early`.
    static constexpr std::size_t horizon = std::size_t{1} << 20;

    /// \param hold_back symbols, ≤ longest_hold_back \throws std::invalid_argument naming the value
    known_spans(const signal_set& set, std::size_t hold_back);

    /*!
     * At any time, for symbols past or to come. Symbols that have gone out are counted as late, the others
     * apply. Spans may overlap where they agree; what is known in advance then outranks what was decoded.
     * Where they differ, one of the two is wrong and nobody can tell which: the earlier one stays, the later
     * one is left out whole. \throws std::invalid_argument where a span is empty, or an index is none of the
     * set: names place and value, and nothing of the span applies
     */
    void add(const known_span& span);

    /*!
     * Takes `count` samples, writes the symbols that leave the hold-back.
     * \param out, reference room for `count` each, apart from `in`
     * \returns how many were written; the total written is max(0, total taken − hold_back)
     */
    std::size_t process(const std::complex<float>* in,
                        std::size_t count,
                        std::complex<float>* out,
                        reference_t* reference);
    /// End of the stream: empties the hold-back, as far as there is `room`. \returns how many were written
    std::size_t finish(std::size_t room, std::complex<float>* out, reference_t* reference);

    const span_counts& counts() const noexcept { return d_counts; }
    std::size_t hold_back() const noexcept { return d_hold_back; }
    std::uint64_t taken() const noexcept { return d_taken; }     ///< samples in so far
    std::uint64_t written() const noexcept { return d_written; } ///< symbols out so far

private:
    void check(const known_span& span) const;
    void release(std::size_t count, std::complex<float>* out);
    void tell(std::size_t count, reference_t* reference);

    const std::size_t d_points, d_hold_back;
    std::uint64_t d_taken = 0, d_written = 0;
    std::uint64_t d_known_end = 0; ///< from here on nothing is known
    // Rings, by the number of the symbol. Where nothing is known, d_codes says so, beyond its reach too.
    std::vector<std::complex<float>> d_samples; ///< d_written … d_taken
    std::vector<reference_t> d_codes;           ///< d_written … d_taken + horizon
    span_counts d_counts;
};

} // namespace halfplane::link
