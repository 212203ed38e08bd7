// SPDX-License-Identifier: GPL-3.0-or-later
// counting: the half of watch that the stream goes through: it only adds to sums.
#pragma once

#include "halfplane/kernels/detect.h"
#include "halfplane/link/watch.h"
#include "second_clock.h"

#include <array>
#include <complex>
#include <cstddef>
#include <cstdint>
#include <optional>

namespace halfplane::link {

inline bool same(const input_snr& a, const input_snr& b)
{
    return a.es_n0_db == b.es_n0_db && a.es_n0_db_se == b.es_n0_db_se && a.measured == b.measured;
}

struct watch::counting {
    static constexpr std::size_t chunk = 1024; ///< symbols taken at a time, at most

    /// Symbols picked out of a chunk, side by side.
    struct picked {
        std::array<std::complex<float>, chunk> samples;
        std::array<std::uint16_t, chunk> sent, decided;
        std::size_t n = 0;
        void add(std::complex<float> sample, int sent_index, std::uint16_t taken_for)
        {
            samples[n] = sample;
            sent[n] = static_cast<std::uint16_t>(sent_index);
            decided[n++] = taken_for;
        }
    };

    counting(const signal_set& s, const watch_options& o);

    void take(const std::complex<float>* in,
              const reference_t* reference,
              const std::uint16_t* received,
              std::size_t n);
    void judge(const std::complex<float>* in,
               const std::uint16_t* sent,
               const std::uint16_t* decided,
               std::size_t n);
    void check_references(const reference_t* reference, std::size_t n) const;
    void sort_out(const std::complex<float>* in,
                  const reference_t* reference,
                  const std::uint16_t* decided,
                  std::size_t n);
    void explain(const std::complex<float>* in, const reference_t* reference, std::size_t n);
    void close(const window_handler& on_window);
    void follow_noise(double n0);
    void take_next_input(const window_handler& on_window);
    void go_on(const reporting& from);

    const signal_set set;
    const bool receiver_decisions;
    const std::uint64_t window_length;
    bool map = false;
    double map_n0 = 0; // what the decider was built for; 0: nearest point
    std::optional<kernels::point_decider> decider;
    std::optional<residual_gatherer> residuals;

    window open;
    std::uint64_t in_window = 0, handed = 0, pending = 0;
    block_counts blocks;
    second_clock seconds;
    trial on_trial;
    std::optional<lock_status> lock;
    std::optional<input_snr> input, next_input; // the next takes effect with the next symbol
};

} // namespace halfplane::link
