// SPDX-License-Identifier: GPL-3.0-or-later
// residual_gatherer: which symbols are looked at, and the sums over a stretch of them.
#include "halfplane/residuals.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

constexpr std::size_t reach = column::reach, lanes = 2 * reach + 1;

/// Σ_k x_k·conj(s_{k+lag}) for the nine lags at once: neighbours lie side by side, so the lanes vectorise.
struct lagged {
    std::array<double, lanes> re{}, im{};

    /// \param re0, im0 of s_{k−4} onwards
    void add(complex x, const double* s_re, const double* s_im)
    {
        const double a = x.real(), b = x.imag();
        for (std::size_t l = 0; l < lanes; ++l) {
            re[l] += a * s_re[l] + b * s_im[l];
            im[l] += b * s_re[l] - a * s_im[l];
        }
    }
    complex at(std::size_t lane) const { return {re[lane], im[lane]}; }
};

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
    d_stretch = {};
    add_products();
    if (d_model)
        add_moments();
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

void residual_gatherer::add_products()
{
    std::array<double, stretch + 2 * reach> re, im;
    for (std::size_t k = 0; k < re.size(); ++k) {
        re[k] = d_sent[k].real();
        im[k] = d_sent[k].imag();
    }
    lagged first, error, image, curve; // against s_{k−4}, e, s*, s(|s|² − κ)
    complex sent{}, sent_curve{}, image_error{}, image_curve{}, errors{}, curves{}, curve_error{};
    double errors_power = 0, curve_power = 0;
    for (std::size_t k = 0; k < stretch; ++k) {
        const complex s = d_sent[k + reach], e = d_received[k + reach] - s;
        const complex q = s * (std::norm(s) - d_kappa);
        first.add({re[k], im[k]}, &re[k], &im[k]);
        error.add(e, &re[k], &im[k]);
        image.add(std::conj(s), &re[k], &im[k]);
        curve.add(q, &re[k], &im[k]);
        sent += s;
        curves += q;
        errors += e;
        image_error += product(s, e);
        image_curve += product(s, q);
        curve_error += product(std::conj(q), e);
        curve_power += std::norm(q);
        errors_power += std::norm(e);
    }

    auto& sums = d_stretch;
    constexpr std::size_t e = column::count;
    const auto put = [&](std::size_t i, std::size_t j, complex value) { // Σ φ_i*·φ_j
        sums.d_gram[i <= j ? residual_sums::place(i, j) : residual_sums::place(j, i)] =
            i <= j ? value : std::conj(value);
    };
    // Neighbours among themselves: Σ s*_{k+i}·s_{k+j} depends on j − i but for the ends of the stretch.
    for (std::size_t apart = 0; apart < lanes; ++apart) {
        complex sum = std::conj(first.at(apart)); // Σ s*_{k−4}·s_{k−4+apart}
        for (std::size_t i = 0; i + apart < lanes; ++i) {
            put(column_of(i), column_of(i + apart), sum);
            if (i + apart + 1 < lanes)
                sum += product(std::conj(d_sent[stretch + i]), d_sent[stretch + i + apart]) -
                       product(std::conj(d_sent[i]), d_sent[i + apart]);
        }
    }
    complex sum{};
    for (std::size_t k = 0; k < stretch; ++k)
        sum += d_sent[k];
    for (std::size_t i = 0; i < lanes; ++i) {
        put(column::offset, column_of(i), sum);
        if (i + 1 < lanes)
            sum += d_sent[stretch + i] - d_sent[i];
        put(column_of(i), column::image, image.at(i));
        put(column_of(i), column::compression, curve.at(i));
        put(column_of(i), e, error.at(i));
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

void residual_gatherer::add_moments()
{
    const auto& beta = d_model->value;
    const complex gain = 1.0 + beta[column::gain];
    const complex turn = std::conj(gain) / std::abs(gain);
    std::array<complex, lanes> taps;
    for (std::size_t l = 0; l < lanes; ++l)
        taps[l] = beta[column_of(l)];

    auto& m = d_stretch.moments;
    complex before{}, gained{};
    double sent_power = 0, block_power = 0;
    for (std::size_t k = 0; k < stretch; ++k) {
        const complex s = d_sent[k + reach];
        complex x = d_received[k + reach] - s - beta[column::offset] -
                    product(beta[column::image], std::conj(s)) -
                    product(beta[column::compression], s * (std::norm(s) - d_kappa));
        for (std::size_t l = 0; l < lanes; ++l)
            x -= product(taps[l], d_sent[k + l]);
        m.square += product(x, x);
        x = product(x, turn);
        const complex along = product(x, std::conj(s)), square = product(along, along);
        const double power = std::norm(x);
        m.power += power;
        m.fourth += power * power;
        m.turned += square;
        m.turned_norm += std::norm(square);
        m.signal_fourth += std::norm(gain) * std::norm(s) * std::norm(s);
        sent_power += std::norm(s);
        gained += along;
        if (k > 0)
            m.lag_one += product(x, std::conj(before));
        before = x;
        block_power += power;
        if (k % block == block - 1) {
            m.block_powers += block_power * block_power;
            block_power = 0;
        }
    }
    m.symbols = stretch;
    m.pairs = stretch - 1;
    m.blocks = stretch / block;
    if (sent_power > 0) {
        // The model's own gain is off by N0·(Φ*Φ)⁻¹, independent of this stretch: as in recursive residuals.
        const double whole =
            sent_power * (1 + sent_power * d_model->inverse[column::gain][column::gain].real());
        m.stretches = 1;
        m.radial_gain = gained.real() * gained.real() / whole;
        m.tangential_gain = gained.imag() * gained.imag() / whole;
    }
}

} // namespace halfplane
