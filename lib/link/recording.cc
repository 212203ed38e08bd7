// SPDX-License-Identifier: GPL-3.0-or-later
// recording: places of the captures in the file, the gaps between them, and reading in large pieces.
#include "halfplane/link/recording.h"

#include "sigmf_meta.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cmath>
#include <stdexcept>
#include <system_error>

namespace halfplane::link {

namespace {

constexpr std::size_t piece_bytes = std::size_t{1} << 20;
const std::string meta_end = ".sigmf-meta", data_end = ".sigmf-data";

bool ends_with(const std::string& text, const std::string& end)
{
    return text.size() > end.size() && text.compare(text.size() - end.size(), end.size(), end) == 0;
}

bool exists(const std::string& path)
{
    return ::access(path.c_str(), F_OK) == 0;
}

std::string because(int error)
{
    return std::generic_category().message(error);
}

/// The metadata file that `path` names; empty where it names a file of samples alone.
std::string meta_path_of(const std::string& path, const std::string& format)
{
    if (ends_with(path, ".sigmf") || ends_with(path, ".sigmf-collection"))
        throw std::invalid_argument(path + ": an archive or a collection; name one recording of it");
    if (ends_with(path, meta_end))
        return path;
    if (ends_with(path, data_end) && format.empty())
        return path.substr(0, path.size() - data_end.size()) + meta_end;
    if (!exists(path) && exists(path + meta_end))
        return path + meta_end;
    return "";
}

std::string data_path_of(const std::string& meta_path, const std::string& dataset)
{
    if (dataset.empty())
        return meta_path.substr(0, meta_path.size() - meta_end.size()) + data_end;
    const auto slash = meta_path.rfind('/');
    return (slash == std::string::npos ? "" : meta_path.substr(0, slash + 1)) + dataset;
}

double seconds_between(const utc_moment& a, const utc_moment& b)
{
    return static_cast<double>(b.seconds - a.seconds) + (b.fraction - a.fraction);
}

/*!
 * Whether samples are missing between two captures: another frequency, a counter that jumps, or, where no
 * counter says so, a time that does not fit within one symbol, 100 ppm of the time gone by (the clocks of a
 * radio that was told a nominal rate) and what the times were rounded to. Without a rate a new time is a
 * jump, as the live aligner has it; without any of these the capture goes on where the one before ended.
 */
bool gap_between(const sigmf_capture& a, const sigmf_capture& b, double rate)
{
    if (a.frequency && b.frequency && *a.frequency != *b.frequency)
        return true;
    const std::uint64_t samples = b.sample_start - a.sample_start;
    if (a.global_index && b.global_index)
        return *b.global_index != *a.global_index + samples;
    if (!a.time || !b.time)
        return false;
    if (rate <= 0)
        return true;
    const double expected = static_cast<double>(samples) / rate;
    const double tolerance =
        std::max({1 / rate, 1e-4 * expected, 1.001 * (a.time->resolution + b.time->resolution) / 2});
    return std::abs(seconds_between(*a.time, *b.time) - expected) > tolerance;
}

} // namespace

struct recording::impl {
    explicit impl(const std::string& datatype) : format(datatype) {}
    ~impl()
    {
        if (file >= 0)
            ::close(file);
    }

    void open();
    void place(std::vector<sigmf_capture> from, std::uint64_t trailing_bytes, const std::string& meta_path);

    std::string path;
    sample_format format;
    double rate = 0;
    std::optional<std::string> sha512;
    nlohmann::json set;
    std::string pattern;

    int file = -1;
    std::uint64_t file_bytes = 0, samples = 0, ignored_bytes = 0;
    std::vector<capture> captures;
    std::vector<std::uint64_t> header_bytes;      ///< up to and with each capture
    std::vector<std::optional<utc_moment>> times; ///< of each capture
    std::uint64_t position = 0;
    std::size_t current = 0; ///< capture of the next sample
    std::vector<unsigned char> bytes;
};

void recording::impl::open()
{
    file = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
    if (file < 0)
        throw std::invalid_argument(path + ": " + because(errno));
    struct stat about {
    };
    if (::fstat(file, &about) != 0 || !S_ISREG(about.st_mode))
        throw std::invalid_argument(path + ": not a file");
    file_bytes = static_cast<std::uint64_t>(about.st_size);
    ::posix_fadvise(file, 0, 0, POSIX_FADV_SEQUENTIAL);
}

void recording::impl::place(std::vector<sigmf_capture> from,
                            std::uint64_t trailing_bytes,
                            const std::string& meta_path)
{
    if (from.empty() || from.front().sample_start > 0)
        from.insert(from.begin(), sigmf_capture{}); // what stands before the first capture
    std::uint64_t others = trailing_bytes;
    for (const auto& each : from) {
        if (each.header_bytes > file_bytes || others > file_bytes - each.header_bytes)
            throw std::invalid_argument(meta_path +
                                        ": core:header_bytes and core:trailing_bytes are more than the " +
                                        std::to_string(file_bytes) + " bytes of " + path);
        others += each.header_bytes;
    }
    samples = (file_bytes - others) / format.bytes();
    ignored_bytes = (file_bytes - others) % format.bytes();
    if (samples == 0)
        throw std::invalid_argument(path + ": no sample in it");
    std::uint64_t headers = 0;
    for (std::size_t k = 0; k < from.size(); ++k) {
        const auto& each = from[k];
        if (each.sample_start >= samples)
            throw std::invalid_argument(meta_path + ": core:sample_start of a capture is " +
                                        std::to_string(each.sample_start) + ", but " + path + " holds " +
                                        std::to_string(samples) + " samples: is it complete?");
        captures.push_back({each.sample_start,
                            each.frequency,
                            each.datetime,
                            k > 0 && gap_between(from[k - 1], each, rate)});
        header_bytes.push_back(headers += each.header_bytes);
        times.push_back(each.time);
    }
}

recording::recording(const std::string& path, const std::string& format, double sample_rate)
{
    if (!(std::isfinite(sample_rate) && sample_rate >= 0))
        throw std::invalid_argument("sample_rate must be a number of Hz, or 0 where the recording says it");
    const auto meta_path = meta_path_of(path, format);
    if (meta_path.empty()) {
        if (format.empty() && exists(path))
            throw std::invalid_argument(path + ": samples without metadata: say their format, as cf32_le");
        d = std::make_unique<impl>(format.empty() ? "cf32_le" : format);
        d->path = path;
        d->rate = sample_rate;
        d->open();
        d->place({}, 0, path);
        return;
    }
    if (!format.empty())
        throw std::invalid_argument(meta_path + " says the format itself; " + format +
                                    " goes with a file of samples alone");
    auto meta = read_sigmf_meta(meta_path);
    try {
        d = std::make_unique<impl>(meta.datatype);
    } catch (const std::invalid_argument& e) {
        throw std::invalid_argument(meta_path + ": core:datatype: " + e.what());
    }
    if (meta.sample_rate > 0 && sample_rate > 0 &&
        std::abs(meta.sample_rate - sample_rate) > 1e-3 * meta.sample_rate)
        throw std::invalid_argument(meta_path + ": core:sample_rate is " + std::to_string(meta.sample_rate) +
                                    " Hz, not the " + std::to_string(sample_rate) +
                                    " Hz that were said: one sample a symbol is wanted");
    d->path = data_path_of(meta_path, meta.dataset);
    d->rate = meta.sample_rate > 0 ? meta.sample_rate : sample_rate;
    d->sha512 = std::move(meta.sha512);
    d->set = std::move(meta.set);
    d->pattern = std::move(meta.pattern);
    d->open();
    d->place(std::move(meta.captures), meta.trailing_bytes, meta_path);
}

recording::~recording() = default;
recording::recording(recording&&) noexcept = default;

std::size_t recording::read(std::complex<float>* out, std::size_t count)
{
    auto& r = *d;
    while (r.current + 1 < r.captures.size() && r.captures[r.current + 1].first <= r.position)
        ++r.current;
    const std::uint64_t end = r.current + 1 < r.captures.size() ? r.captures[r.current + 1].first : r.samples;
    const std::size_t size = r.format.bytes();
    const auto wanted =
        static_cast<std::size_t>(std::min<std::uint64_t>({count, end - r.position, piece_bytes / size}));
    r.bytes.resize(piece_bytes);
    for (std::size_t done = 0; done < wanted * size;) {
        const std::uint64_t place = r.position * size + r.header_bytes[r.current] + done;
        const auto n =
            ::pread(r.file, r.bytes.data() + done, wanted * size - done, static_cast<off_t>(place));
        if (n > 0)
            done += static_cast<std::size_t>(n);
        else if (n == 0 || errno != EINTR)
            throw std::runtime_error(r.path + ": cannot be read at byte " + std::to_string(place) + ": " +
                                     (n == 0 ? "the file has become shorter" : because(errno)));
    }
    r.format.convert(r.bytes.data(), wanted, out);
    r.position += wanted;
    return wanted;
}

std::string recording::time_of(std::uint64_t sample) const
{
    std::optional<std::size_t> latest;
    for (std::size_t k = 0; k < d->captures.size() && d->captures[k].first <= sample; ++k)
        if (d->times[k])
            latest = k;
        else if (d->captures[k].gap)
            latest.reset(); // how long the gap was is not known
    if (!latest || (d->rate <= 0 && sample != d->captures[*latest].first))
        return {};
    const auto gone = static_cast<double>(sample - d->captures[*latest].first);
    return utc_text(*d->times[*latest], gone > 0 ? gone / d->rate : 0);
}

const std::string& recording::data_path() const noexcept
{
    return d->path;
}
const sample_format& recording::format() const noexcept
{
    return d->format;
}
double recording::sample_rate() const noexcept
{
    return d->rate;
}
std::uint64_t recording::samples() const noexcept
{
    return d->samples;
}
std::uint64_t recording::ignored_bytes() const noexcept
{
    return d->ignored_bytes;
}
const std::vector<recording::capture>& recording::captures() const noexcept
{
    return d->captures;
}
const std::optional<std::string>& recording::sha512() const noexcept
{
    return d->sha512;
}
const nlohmann::json& recording::set() const noexcept
{
    return d->set;
}
const std::string& recording::pattern() const noexcept
{
    return d->pattern;
}
std::uint64_t recording::position() const noexcept
{
    return d->position;
}

} // namespace halfplane::link
