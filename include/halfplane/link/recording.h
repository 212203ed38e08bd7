// SPDX-License-Identifier: GPL-3.0-or-later
// recording: samples on disk, with what is known of them, read from front to back.
#pragma once

#include "halfplane/link/sample_format.h"

#include <nlohmann/json.hpp>

#include <complex>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace halfplane::link {

/*!
 * A recording in SigMF (`NAME.sigmf-meta` beside its data; either file or NAME alone may be named), or a file
 * of nothing but samples, whose format must be said.
 *
 * Of SigMF's core fields are read: core:datatype, core:sample_rate, core:num_channels (1 only), core:offset,
 * core:dataset, core:metadata_only (refused), core:trailing_bytes, core:sha512 (handed on, not verified
 * here); of captures: core:sample_start, core:global_index, core:datetime, core:frequency, core:header_bytes.
 * Of our own: halfplane:set and halfplane:pattern. Everything else is passed over. (Field names and meanings
 * stand from memory of SigMF 1.x.)
 *
 * Bytes at the end that make no whole sample are left out and counted. A recording is not copied, and not
 * kept in memory.
 */
class recording
{
public:
    /// A part of the recording that is whole in itself.
    struct capture {
        std::uint64_t first = 0; ///< its first sample, from 0
        std::optional<double> frequency;
        std::optional<std::string> datetime; ///< of its first sample, as written
        bool gap = false; ///< samples are missing before it, by its counter, time or frequency
    };

    /// \param format of a file without metadata ("cf32_le"); with metadata it must be empty
    /// \param sample_rate Hz, for a recording that does not say it; one that differs by more than 0.1 % from
    /// what it says is refused; 0: as it says
    /// \throws std::invalid_argument naming the file and the field or line that is refused
    explicit recording(const std::string& path, const std::string& format = "", double sample_rate = 0);
    ~recording();
    recording(recording&&) noexcept;

    const std::string& data_path() const noexcept;
    const sample_format& format() const noexcept;
    double sample_rate() const noexcept;                   ///< Hz; 0 where unknown
    std::uint64_t samples() const noexcept;                ///< whole ones
    std::uint64_t ignored_bytes() const noexcept;          ///< at the end, less than a sample
    const std::vector<capture>& captures() const noexcept; ///< at least one, ascending
    const std::optional<std::string>& sha512() const noexcept;
    /// What the recording says was sent: halfplane:set (a name, or the document of a set file) and
    /// halfplane:pattern; null or empty where it does not.
    const nlohmann::json& set() const noexcept;
    const std::string& pattern() const noexcept;

    /// UTC of a sample by the latest datetime at or before it and the sample rate, RFC 3339 in milliseconds;
    /// empty where unknown.
    std::string time_of(std::uint64_t sample) const;

    /// The next `count` samples at most, never across a capture's first sample; 0 at the end.
    /// \throws std::runtime_error where the disk gives less than the file had
    std::size_t read(std::complex<float>* out, std::size_t count);
    /// Samples read so far: the place of the next one.
    std::uint64_t position() const noexcept;

private:
    struct impl;
    std::unique_ptr<impl> d;
};

} // namespace halfplane::link
