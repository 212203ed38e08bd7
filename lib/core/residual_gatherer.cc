// SPDX-License-Identifier: GPL-3.0-or-later
// residual_gatherer: which symbols are looked at, and the sums over a stretch of them.
#include "halfplane/residuals.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

constexpr std::size_t reach = column::reach, lanes = 2 * reach + 1;

constexpr std::size_t stretch = residual_gatherer::stretch, seen = stretch + 2 * reach;

/// Real and imaginary parts apart, so that loops over them vectorise.
template <std::size_t n>
struct parts {
    std::array<double, n> re, im;
    complex at(std::size_t k) const { return {re[k], im[k]}; }
    void set(std::size_t k, complex x)
    {
        re[k] = x.real();
        im[k] = x.imag();
    }
};

/// Σ_k x_k·conj(s_{k+lane}) over a stretch, for all lanes at once: neighbours lie side by side.
parts<lanes> correlate(const parts<stretch>& x, const parts<seen>& s)
{
    parts<lanes> sum{};
    for (std::size_t k = 0; k < stretch; ++k) {
        const double a = x.re[k], b = x.im[k];
        for (std::size_t l = 0; l < lanes; ++l) {
            sum.re[l] += a * s.re[k + l] + b * s.im[k + l];
            sum.im[l] += b * s.re[k + l] - a * s.im[k + l];
        }
    }
    return sum;
}

/// Column of the neighbour in this lane; the middle one is the symbol itself.
constexpr std::size_t column_of(std::size_t lane)
{
    return lane == reach ? column::gain : column::neighbour(static_cast<int>(lane) - static_cast<int>(reach));
}

complex product(complex a, complex b) // written out: std::complex would check for NaN
{
    return {a.real() * b.real() - a.imag() * b.imag(), a.real() * b.imag() + a.imag() * b.real()};
}

} // namespace

/// One stretch laid out for the sums.
struct residual_gatherer::layout {
    parts<seen> sent;                   // with the neighbours at both ends
    parts<stretch> error, image, curve; // e, s*, s(|s|² − κ)
};

residual_gatherer::residual_gatherer(const signal_set& set) : d_scale(1 / std::sqrt(set.es())), d_kappa(0)
{
    for (std::size_t i = 0; i < set.size(); ++i) {
        d_points.push_back(set.points()[i] * d_scale);
        d_kappa += set.priors()[i] * std::norm(d_points[i]) * std::norm(d_points[i]);
    }
    d_received.reserve(stretch + 2 * reach);
    d_sent.reserve(stretch + 2 * reach);
    draw_place();
}

void residual_gatherer::draw_place()
{
    d_random = d_random * 6364136223846793005u + 1442695040888963407u; // Knuth's MMIX generator
    constexpr std::size_t free = period - stretch - 2 * reach;
    d_before = d_after + static_cast<std::size_t>((d_random >> 33) % free);
    d_after = free + d_after - d_before;
}

void residual_gatherer::add(const std::complex<float>* in, const reference_t* reference, std::size_t n)
{
    for (std::size_t k = 0; k < n;) {
        if (d_before > 0) {
            const auto passed = std::min(d_before, n - k);
            d_before -= passed;
            k += passed;
            continue;
        }
        const std::complex<float> r = in[k];
        if (reference[k] < 0 || !std::isfinite(r.real()) || !std::isfinite(r.imag())) {
            d_received.clear();
            d_sent.clear();
        } else {
            d_received.push_back(complex(r) * d_scale);
            d_sent.push_back(d_points[static_cast<std::size_t>(reference[k])]);
            if (d_sent.size() == stretch + 2 * reach)
                close_stretch();
        }
        ++k;
    }
}

residual_sums residual_gatherer::take()
{
    residual_sums out = d_new;
    d_new = {};
    return out;
}

void residual_gatherer::close_stretch()
{
    layout at;
    for (std::size_t k = 0; k < seen; ++k)
        at.sent.set(k, d_sent[k]);
    for (std::size_t k = 0; k < stretch; ++k) {
        const complex s = d_sent[k + reach];
        at.error.set(k, d_received[k + reach] - s);
        at.image.set(k, std::conj(s));
        at.curve.set(k, s * (std::norm(s) - d_kappa));
    }
    d_stretch = {};
    add_products(at);
    if (d_model)
        add_moments(at);
    d_all.merge(d_stretch);
    d_new.merge(d_stretch);
    if (d_all.symbols() >= d_next_fit) {
        d_model = fit_residuals(d_all);
        d_next_fit = d_all.symbols() + d_all.symbols() / 16;
    }
    d_received.clear();
    d_sent.clear();
    draw_place();
}

void residual_gatherer::add_products(const layout& at)
{
    parts<stretch> first;
    std::copy_n(at.sent.re.begin(), stretch, first.re.begin());
    std::copy_n(at.sent.im.begin(), stretch, first.im.begin());
    const auto of_first = correlate(first, at.sent), of_error = correlate(at.error, at.sent);
    const auto of_image = correlate(at.image, at.sent), of_curve = correlate(at.curve, at.sent);
    complex first_sum{}, sent{}, errors{}, curves{}, image_error{}, image_curve{}, curve_error{};
    double errors_power = 0, curve_power = 0;
    for (std::size_t k = 0; k < stretch; ++k) {
        const complex e = at.error.at(k), q = at.curve.at(k), s = at.sent.at(k + reach);
        first_sum += at.sent.at(k);
        sent += s;
        errors += e;
        curves += q;
        image_error += product(s, e);
        image_curve += product(s, q);
        curve_error += product(std::conj(q), e);
        errors_power += std::norm(e);
        curve_power += std::norm(q);
    }

    auto& sums = d_stretch;
    constexpr std::size_t e = column::count;
    const auto put = [&](std::size_t i, std::size_t j, complex value) { // Σ φ_i*·φ_j
        sums.d_gram[i <= j ? residual_sums::place(i, j) : residual_sums::place(j, i)] =
            i <= j ? value : std::conj(value);
    };
    // Neighbours among themselves: Σ s*_{k+i}·s_{k+j} depends on j − i but for the ends of the stretch.
    for (std::size_t apart = 0; apart < lanes; ++apart) {
        complex sum = std::conj(of_first.at(apart));
        for (std::size_t i = 0; i + apart < lanes; ++i) {
            put(column_of(i), column_of(i + apart), sum);
            if (i + apart + 1 < lanes)
                sum += product(std::conj(d_sent[stretch + i]), d_sent[stretch + i + apart]) -
                       product(std::conj(d_sent[i]), d_sent[i + apart]);
        }
    }
    for (std::size_t i = 0; i < lanes; ++i) {
        put(column::offset, column_of(i), first_sum);
        if (i + 1 < lanes)
            first_sum += d_sent[stretch + i] - d_sent[i];
        put(column_of(i), column::image, of_image.at(i));
        put(column_of(i), column::compression, of_curve.at(i));
        put(column_of(i), e, of_error.at(i));
    }
    put(column::offset, column::offset, static_cast<double>(stretch));
    put(column::offset, column::image, std::conj(sent));
    put(column::offset, column::compression, curves);
    put(column::offset, e, errors);
    put(column::image, column::image, sums.product(column::gain, column::gain));
    put(column::image, column::compression, image_curve);
    put(column::image, e, image_error);
    put(column::compression, column::compression, curve_power);
    put(column::compression, e, curve_error);
    put(e, e, errors_power);
    sums.d_symbols = stretch;
}

void residual_gatherer::add_moments(const layout& at)
{
    const auto& beta = d_model->value;
    auto left = at.error;
    const auto take_off = [&](complex c, const double* re, const double* im) {
        const double a = c.real(), b = c.imag();
        if (a == 0 && b == 0)
            return;
        for (std::size_t k = 0; k < stretch; ++k) {
            left.re[k] -= a * re[k] - b * im[k];
            left.im[k] -= a * im[k] + b * re[k];
        }
    };
    for (std::size_t l = 0; l < lanes; ++l)
        take_off(beta[column_of(l)], &at.sent.re[l], &at.sent.im[l]);
    take_off(beta[column::image], at.image.re.data(), at.image.im.data());
    take_off(beta[column::compression], at.curve.re.data(), at.curve.im.data());

    const complex gain = 1.0 + beta[column::gain], offset = beta[column::offset];
    const complex turn = std::conj(gain) / std::abs(gain);
    residual_moments m;
    complex before{}, gained{};
    double sent_power = 0, sent_fourth = 0, block_power = 0, power_before = 0;
    for (std::size_t k = 0; k < stretch; ++k) {
        const complex s = at.sent.at(k + reach), x = left.at(k) - offset;
        const complex along = product(product(x, turn), std::conj(s)), square = product(along, along);
        const double power = std::norm(x), sent = std::norm(s);
        m.power += power;
        m.fourth += power * power;
        m.square += product(x, x);
        m.turned += square;
        m.turned_norm += power * power * sent * sent;
        sent_power += sent;
        sent_fourth += sent * sent;
        gained += along;
        m.lag_one += product(x, std::conj(before));
        m.lag_one_norm += power * power_before;
        before = x;
        power_before = power;
        block_power += power;
        if (k % block == block - 1) {
            m.block_powers += block_power * block_power;
            block_power = 0;
        }
    }
    m.symbols = stretch;
    m.signal_fourth = std::norm(gain) * sent_fourth;
    m.pairs = stretch - 1;
    m.blocks = stretch / block;
    if (sent_power > 0) {
        // Noise of a gain: N0·Σ|s|², N0 by this stretch without what its gain takes, and the error of the
        // model's gain, which is independent of it, as in recursive residuals. The ratio has Fisher's law of
        // (1, 2n − 2) degrees of freedom; (2n − 4)/(2n − 2) brings its mean to 1.
        const double n0 = (m.power - std::norm(gained) / sent_power) / (stretch - 1);
        const double gain_error = d_model->inverse[column::gain][column::gain].real();
        const double variance = n0 / 2 * sent_power * (1 + sent_power * gain_error);
        constexpr double to_mean_one = (2.0 * stretch - 4) / (2.0 * stretch - 2);
        if (variance > 0) {
            m.stretches = 1;
            m.radial_gain = to_mean_one * gained.real() * gained.real() / variance;
            m.tangential_gain = to_mean_one * gained.imag() * gained.imag() / variance;
        }
    }
    d_stretch.moments = m;
}

} // namespace halfplane
