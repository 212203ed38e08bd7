// SPDX-License-Identifier: GPL-3.0-or-later
// gauge: least squares from sums.
#include "halfplane/gauge.h"

#include <algorithm>
#include <cmath>

namespace halfplane {

namespace {

constexpr std::size_t chunk = 1024;
constexpr double db_of_natural = 4.342944819032518276511289189166; // 10/ln 10
constexpr long double least_noise =
    1e-13L; // of the received energy: beyond what chunk sums in double round off
constexpr long double least_spread = 1e-12L; // of the sent energy: below, one point only was sent

using wide = std::complex<long double>;

/// Sums of one chunk in double precision, written out in real arithmetic: std::complex would check for NaN.
struct chunk_sums {
    double r_re = 0, r_im = 0, s_re = 0, s_im = 0, rs_re = 0, rs_im = 0, rr = 0, ss = 0;

    void add(double a, double b, double c, double d)
    {
        r_re += a;
        r_im += b;
        s_re += c;
        s_im += d;
        rs_re += a * c + b * d;
        rs_im += b * c - a * d;
        rr += a * a + b * b;
        ss += c * c + d * d;
    }
};

} // namespace

void gauge::sums::merge(const sums& later)
{
    n += later.n;
    r_re += later.r_re;
    r_im += later.r_im;
    s_re += later.s_re;
    s_im += later.s_im;
    rs_re += later.rs_re;
    rs_im += later.rs_im;
    rr += later.rr;
    ss += later.ss;
}

void gauge::add(const std::complex<float>* received,
                const std::uint16_t* sent,
                const std::uint16_t* decided,
                std::size_t n,
                const std::vector<complex>& points)
{
    auto widened = [](const chunk_sums& c, std::uint64_t count) {
        return sums{count, c.r_re, c.r_im, c.s_re, c.s_im, c.rs_re, c.rs_im, c.rr, c.ss};
    };
    for (std::size_t first = 0; first < n; first += chunk) {
        const std::size_t end = std::min(n, first + chunk);
        chunk_sums all, wrong;
        std::uint64_t errors = 0;
        for (std::size_t k = first; k < end; ++k) {
            const double a = received[k].real(), b = received[k].imag();
            const double c = points[sent[k]].real(), d = points[sent[k]].imag();
            all.add(a, b, c, d);
            if (sent[k] != decided[k]) {
                wrong.add(a, b, c, d);
                ++errors;
            }
        }
        d_all.merge(widened(all, end - first));
        if (errors != 0)
            d_errors.merge(widened(wrong, errors));
    }
}

void gauge::add(std::complex<float> received, complex sent, bool error)
{
    const std::uint16_t index = 0, decided = error ? 1 : 0;
    add(&received, &index, &decided, 1, {sent});
}

void gauge::merge(const gauge& later)
{
    d_all.merge(later.d_all);
    d_errors.merge(later.d_errors);
}

std::optional<gauge_result> gauge::solve(const signal_set& set) const
{
    if (d_all.n < 3)
        return std::nullopt;
    const long double n = static_cast<long double>(d_all.n);
    const wide r_mean{d_all.r_re / n, d_all.r_im / n}, s_mean{d_all.s_re / n, d_all.s_im / n};
    const wide rs = wide{d_all.rs_re, d_all.rs_im} - n * r_mean * std::conj(s_mean);
    const long double rr = d_all.rr - n * std::norm(r_mean);
    const long double ss = d_all.ss - n * std::norm(s_mean);
    if (!(ss > least_spread * d_all.ss))
        return std::nullopt;
    const wide g = rs / ss, o = r_mean - g * s_mean;
    const long double residual = rr - std::norm(rs) / ss;
    if (!(residual > least_noise * d_all.rr) || g == wide{})
        return std::nullopt;

    const long double n0 = residual / (n - 2);
    gauge_result result{};
    result.gain = complex(g);
    result.offset = complex(o);
    result.n0 = static_cast<double>(n0);
    result.es_n0 = static_cast<double>(std::norm(g) * set.es() / n0);
    result.es_n0_db_se =
        db_of_natural * std::sqrt(static_cast<double>((1 + 2 / static_cast<long double>(result.es_n0)) / n));
    result.evm_rms = static_cast<double>(std::sqrt(residual / (std::norm(g) * d_all.ss)));
    result.mer_db = -20 * std::log10(result.evm_rms);

    // Over the erroneous symbols alone: Σ e·s* and Σ|e|² from their own sums, with the g and o of all.
    const auto& w = d_errors;
    const long double m = static_cast<long double>(w.n);
    const wide wr{w.r_re, w.r_im}, ws{w.s_re, w.s_im}, wrs{w.rs_re, w.rs_im};
    const wide sum_e = wr - g * ws - m * o;
    const wide sum_es = wrs - g * w.ss - o * std::conj(ws);
    const long double sum_ee = w.rr + std::norm(g) * w.ss + m * std::norm(o) -
                               2 * std::real(std::conj(g) * wrs) - 2 * std::real(std::conj(o) * wr) +
                               2 * std::real(std::conj(o) * g * ws);
    result.error_influence = static_cast<double>(
        2 * std::real((sum_es - sum_e * std::conj(s_mean)) / g) / (ss / n) - (sum_ee / n0 - m));
    return result;
}

} // namespace halfplane
