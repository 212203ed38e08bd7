// SPDX-License-Identifier: GPL-3.0-or-later
// input_gauge: periodograms, batches of them, and the ratio with its error.
#include "halfplane/link/input_gauge.h"

#include "align_fft.h"
#include "refuse.h"

#include <array>
#include <cmath>
#include <vector>

namespace halfplane::link {

namespace {

constexpr double db_of_natural = 4.342944819032518276511289189166; // 10/ln 10
constexpr std::size_t smallest = 256, largest = 65536;             // samples of a segment
constexpr std::size_t band_bins = 64, noise_bins = 32;             // wanted in either band
constexpr std::size_t lobe = 4; // bins that the window's main lobe reaches to either side
constexpr std::size_t most_batches = 64;

std::vector<float> harris(std::size_t n)
{
    constexpr std::array a{0.35875, -0.48829, 0.14128, -0.01168};
    std::vector<float> w(n);
    for (std::size_t k = 0; k < n; ++k) {
        double sum = 0;
        for (std::size_t m = 0; m < a.size(); ++m)
            sum += a[m] * std::cos(2 * M_PI * static_cast<double>(m * k) / static_cast<double>(n));
        w[k] = static_cast<float>(sum);
    }
    return w;
}

void check_band(const char* name, const frequency_band& b, double sample_rate)
{
    if (!(std::isfinite(b.low) && std::isfinite(b.high) && b.low < b.high))
        refuse(
            name, " is ", b.low, " … ", b.high, " Hz; two finite frequencies in ascending order are wanted");
    if (b.low < -sample_rate / 2 || b.high > sample_rate / 2)
        refuse(name,
               " is ",
               b.low,
               " … ",
               b.high,
               " Hz; at a sample rate of ",
               sample_rate,
               " Hz it must lie within ± ",
               sample_rate / 2,
               " Hz");
}

void check(const input_gauge_options& o)
{
    if (!(std::isfinite(o.sample_rate) && o.sample_rate > 0))
        refuse("sample_rate is ", o.sample_rate, "; a finite number of Hz above 0 is wanted");
    if (!(o.symbol_rate > 0 && o.symbol_rate <= o.sample_rate))
        refuse("symbol_rate is ",
               o.symbol_rate,
               "; a number of Hz above 0 and up to the sample rate of ",
               o.sample_rate,
               " is wanted");
    check_band("band", o.band, o.sample_rate);
    if (o.band.width() < o.symbol_rate)
        refuse("band is ",
               o.band.width(),
               " Hz wide; a signal of ",
               o.symbol_rate,
               " symbols a second fills more");
    if (!o.noise_band)
        return;
    check_band("noise_band", *o.noise_band, o.sample_rate);
    if (o.noise_band->low < o.band.high && o.band.low < o.noise_band->high)
        refuse("noise_band ",
               o.noise_band->low,
               " … ",
               o.noise_band->high,
               " Hz overlaps band ",
               o.band.low,
               " … ",
               o.band.high,
               " Hz");
}

double bins(double hz, std::size_t segment, double sample_rate)
{
    return hz * static_cast<double>(segment) / sample_rate;
}

std::size_t segment_for(const input_gauge_options& o)
{
    for (std::size_t n = smallest; n <= largest; n *= 2)
        if (bins(o.band.width(), n, o.sample_rate) >= band_bins &&
            (!o.noise_band || bins(o.noise_band->width(), n, o.sample_rate) >= noise_bins + 2 * lobe))
            return n;
    const bool narrow = bins(o.band.width(), largest, o.sample_rate) < band_bins;
    refuse(narrow ? "band" : "noise_band",
           " is ",
           narrow ? o.band.width() : o.noise_band->width(),
           " Hz wide: too narrow at a sample rate of ",
           o.sample_rate,
           " Hz; resample to a lower one");
}

/// Places of the bins from low to high, in the order of the transform.
std::vector<std::size_t> places(const frequency_band& b, std::size_t segment, double sample_rate)
{
    std::vector<std::size_t> out;
    const auto first = static_cast<long>(std::ceil(bins(b.low, segment, sample_rate))),
               last = static_cast<long>(std::floor(bins(b.high, segment, sample_rate))),
               n = static_cast<long>(segment);
    for (long k = first; k <= last && k < first + n; ++k)
        out.push_back(static_cast<std::size_t>((k % n + n) % n));
    return out;
}

/// Spectra of consecutive segments, summed in at most `most_batches` batches of equal length.
class batches
{
public:
    explicit batches(std::size_t places) : d_places(places) {}

    template <typename Spectrum>
    void add(Spectrum power_at)
    {
        if (d_in_last == 0)
            d_sums.emplace_back(d_places, 0.0);
        auto& sum = d_sums.back();
        for (std::size_t k = 0; k < d_places; ++k)
            sum[k] += power_at(k);
        ++d_segments;
        if (++d_in_last < d_length)
            return;
        d_in_last = 0;
        if (d_sums.size() == most_batches)
            halve();
    }
    std::uint64_t segments() const { return d_segments; }
    /// Mean spectra of the batches that are whole.
    std::vector<std::vector<double>> means() const
    {
        auto out = d_sums;
        if (d_in_last > 0)
            out.pop_back();
        for (auto& sum : out)
            for (auto& x : sum)
                x /= static_cast<double>(d_length);
        return out;
    }

private:
    void halve()
    {
        for (std::size_t b = 0; b < most_batches / 2; ++b) {
            auto& to = d_sums[b];
            if (b > 0)
                to = d_sums[2 * b];
            for (std::size_t k = 0; k < d_places; ++k)
                to[k] += d_sums[2 * b + 1][k];
        }
        d_sums.resize(most_batches / 2);
        d_length *= 2;
    }

    std::size_t d_places;
    std::vector<std::vector<double>> d_sums;
    std::uint64_t d_segments = 0, d_length = 1, d_in_last = 0;
};

std::vector<double> mean_of(const std::vector<std::vector<double>>& spectra)
{
    std::vector<double> out(spectra.front().size(), 0.0);
    for (const auto& spectrum : spectra)
        for (std::size_t k = 0; k < out.size(); ++k)
            out[k] += spectrum[k] / static_cast<double>(spectra.size());
    return out;
}

/// Variance of the mean of values that scatter about 0.
double variance_of_mean(const std::vector<double>& values)
{
    const double n = static_cast<double>(values.size());
    double mean = 0, sum = 0;
    for (const double x : values)
        mean += x / n;
    for (const double x : values)
        sum += (x - mean) * (x - mean);
    return sum / (n - 1) / n;
}

} // namespace

struct input_gauge::impl {
    explicit impl(const input_gauge_options& o)
        : options(o), length(segment_for(o)), hop(o.hop > 0 ? o.hop : length / 2), transform(length),
          window(harris(length)), in_band(places(o.band, length, o.sample_rate)), with(0), quiet(0)
    {
        double squares = 0;
        for (const float w : window)
            squares += static_cast<double>(w) * static_cast<double>(w);
        scale = 1 / (o.sample_rate * squares);
        if (const auto& edges = o.noise_band)
            in_noise = places({edges->low + lobe * bin(), edges->high - lobe * bin()}, length, o.sample_rate);
        at = in_band;
        at.insert(at.end(), in_noise.begin(), in_noise.end());
        with = batches(at.size());
        quiet = batches(in_band.size());
        open.reserve(length);
    }

    double bin() const { return options.sample_rate / static_cast<double>(length); }
    void close_segment();
    std::optional<input_reading> against_noise_band() const;
    std::optional<input_reading> against_quiet() const;
    std::optional<input_reading>
    reading(double power, double power_variance, double density, double log_variance) const;

    const input_gauge_options options;
    const std::size_t length, hop;
    fft transform;
    const std::vector<float> window;
    std::vector<std::size_t> in_band, in_noise, at; // `at`: both, one after the other
    double scale;                                   // of |X|² to power per Hz

    bool on = true;
    std::vector<std::complex<float>> open, work;
    std::size_t to_skip = 0;
    bool damaged = false; // a sample of `open` is not finite
    std::uint64_t nonfinite = 0;
    batches with, quiet;
};

void input_gauge::impl::close_segment()
{
    if (!damaged) {
        work.resize(length);
        for (std::size_t k = 0; k < length; ++k)
            work[k] = open[k] * window[k];
        transform.transform(work.data());
        (on ? with : quiet).add([&](std::size_t k) {
            return scale * std::norm(std::complex<double>(work[at[k]]));
        });
    }
    if (hop < length) {
        open.erase(open.begin(), open.begin() + static_cast<std::ptrdiff_t>(hop));
        damaged = false;
        for (const auto& r : open)
            damaged |= !(std::isfinite(r.real()) && std::isfinite(r.imag()));
    } else {
        open.clear();
        damaged = false;
        to_skip = hop - length;
    }
}

/// \param log_variance of ln(power/density)
std::optional<input_reading>
input_gauge::impl::reading(double power, double power_variance, double density, double log_variance) const
{
    if (!(density > 0 && power > 2 * std::sqrt(power_variance)))
        return std::nullopt;
    const double ratio = power / (options.symbol_rate * density);
    return input_reading{db_of_natural * std::log(ratio),
                         db_of_natural * std::sqrt(log_variance),
                         power,
                         density,
                         with.segments(),
                         quiet.segments()};
}

/// Band power and density of one batch come from the same samples: the scatter of both together.
std::optional<input_reading> input_gauge::impl::against_noise_band() const
{
    const auto spectra = with.means();
    const double width = static_cast<double>(in_band.size()) * bin();
    std::vector<double> power, density; // by batch
    double mean_power = 0, mean_density = 0;
    for (const auto& spectrum : spectra) {
        double band = 0, noise = 0;
        for (std::size_t k = 0; k < spectrum.size(); ++k)
            (k < in_band.size() ? band : noise) += spectrum[k];
        density.push_back(noise / static_cast<double>(in_noise.size()));
        power.push_back(band * bin() - width * density.back());
        mean_power += power.back() / static_cast<double>(spectra.size());
        mean_density += density.back() / static_cast<double>(spectra.size());
    }
    std::vector<double> logs;
    for (std::size_t b = 0; b < power.size(); ++b)
        logs.push_back(power[b] / mean_power - density[b] / mean_density);
    return reading(mean_power, variance_of_mean(power), mean_density, variance_of_mean(logs));
}

std::optional<input_reading> input_gauge::impl::against_quiet() const
{
    const auto spectra = with.means(), quiet_spectra = quiet.means();
    const auto all = mean_of(spectra), noise = mean_of(quiet_spectra);
    double above = 0, weighted = 0; // Σ of signal, of noise times signal
    for (std::size_t k = 0; k < in_band.size(); ++k) {
        above += all[k] - noise[k];
        weighted += noise[k] * (all[k] - noise[k]);
    }
    const double power = above * bin(), density = weighted / above;
    std::vector<double> powers, quiet_powers, quiet_logs;
    for (const auto& spectrum : spectra) {
        powers.push_back(0);
        for (std::size_t k = 0; k < in_band.size(); ++k)
            powers.back() += spectrum[k] * bin();
    }
    for (const auto& spectrum : quiet_spectra) {
        double band = 0, seen = 0;
        for (std::size_t k = 0; k < in_band.size(); ++k) {
            band += spectrum[k] * bin();
            seen += spectrum[k] * (all[k] - noise[k]) / above;
        }
        quiet_powers.push_back(band);
        quiet_logs.push_back(band / power + seen / density); // both pull ln(power/density) down
    }
    const double of_power = variance_of_mean(powers);
    return reading(power,
                   of_power + variance_of_mean(quiet_powers),
                   density,
                   of_power / (power * power) + variance_of_mean(quiet_logs));
}

input_gauge::input_gauge(const input_gauge_options& options)
{
    check(options);
    d = std::make_unique<impl>(options);
}

input_gauge::~input_gauge() = default;
input_gauge::input_gauge(input_gauge&&) noexcept = default;

void input_gauge::add(const std::complex<float>* in, std::size_t n, bool transmitter_on)
{
    if (transmitter_on != d->on) {
        gap();
        d->on = transmitter_on;
    }
    const bool wanted = transmitter_on || !d->options.noise_band;
    for (std::size_t k = 0; k < n; ++k) {
        const bool finite = std::isfinite(in[k].real()) && std::isfinite(in[k].imag());
        d->nonfinite += !finite;
        if (d->to_skip > 0) {
            --d->to_skip;
            continue;
        }
        if (!wanted)
            continue;
        d->damaged |= !finite;
        d->open.push_back(in[k]);
        if (d->open.size() == d->length)
            d->close_segment();
    }
}

void input_gauge::gap()
{
    d->open.clear();
    d->damaged = false;
}

std::optional<input_reading> input_gauge::read() const
{
    if (d->with.segments() < least_segments)
        return std::nullopt;
    if (d->options.noise_band)
        return d->against_noise_band();
    return d->quiet.segments() < least_segments ? std::nullopt : d->against_quiet();
}

void input_gauge::restart()
{
    d->with = batches(d->at.size());
}

void input_gauge::restart_quiet()
{
    d->quiet = batches(d->in_band.size());
}

std::size_t input_gauge::segment() const noexcept
{
    return d->length;
}

std::uint64_t input_gauge::nonfinite() const noexcept
{
    return d->nonfinite;
}

} // namespace halfplane::link
