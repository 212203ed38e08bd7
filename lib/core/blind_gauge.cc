// SPDX-License-Identifier: GPL-3.0-or-later
// blind_gauge: the maximum of the mixture's likelihood, and how sharp it is.
#include "halfplane/blind_gauge.h"

#include "point_grid.h"

#include <array>
#include <cmath>

namespace halfplane {

namespace {

constexpr double db_of_natural = 4.342944819032518276511289189166; // 10/ln 10
constexpr double least_noise = 1e-13;                              // of the received energy
constexpr double negligible = 20; // natural logarithm below the nearest point: 2e-9 of a sample's likelihood
constexpr std::size_t all_points = 24; // up to this size nobody looks for the near ones
constexpr std::size_t samples_to_start = 256;
constexpr int most_steps = 200;
constexpr double converged = 1e-8; // twice what the logarithm of the likelihood has still to gain

/// Unknowns in order: Re g, Im g, Re o, Im o, ln N0.
constexpr std::size_t unknowns = 5;
using vector = std::array<double, unknowns>;
using matrix = std::array<vector, unknowns>;

struct state {
    complex gain, offset;
    double log_n0;
    double n0() const { return std::exp(log_n0); }
};

state moved(const state& from, const vector& step)
{
    return {from.gain + complex(step[0], step[1]),
            from.offset + complex(step[2], step[3]),
            from.log_n0 + step[4]};
}

/// Lower triangle of Cholesky's factor; nothing unless positive definite.
std::optional<matrix> factor(const matrix& a)
{
    matrix l{};
    for (std::size_t i = 0; i < unknowns; ++i)
        for (std::size_t j = 0; j <= i; ++j) {
            double sum = a[i][j];
            for (std::size_t k = 0; k < j; ++k)
                sum -= l[i][k] * l[j][k];
            if (i != j)
                l[i][j] = sum / l[j][j];
            else if (sum > 1e-10 * a[i][i])
                l[i][i] = std::sqrt(sum);
            else
                return std::nullopt;
        }
    return l;
}

/// y of l·y = b: then |y|² = bᵀ·(l·lᵀ)⁻¹·b.
vector forward(const matrix& l, vector b)
{
    for (std::size_t i = 0; i < unknowns; ++i) {
        for (std::size_t k = 0; k < i; ++k)
            b[i] -= l[i][k] * b[k];
        b[i] /= l[i][i];
    }
    return b;
}

vector backward(const matrix& l, vector y)
{
    for (std::size_t i = unknowns; i-- > 0;) {
        for (std::size_t k = i + 1; k < unknowns; ++k)
            y[i] -= l[k][i] * y[k];
        y[i] /= l[i][i];
    }
    return y;
}

double square(const vector& v)
{
    double sum = 0;
    for (const double x : v)
        sum += x * x;
    return sum;
}

/// The likelihood at one place, with what either kind of step needs.
struct evaluation {
    state at;
    double log_likelihood = 0;
    vector gradient{};
    matrix information{}; ///< minus the second derivatives
    // Sums over samples of posterior means, for expectation-maximisation.
    complex r, s, rs;
    double rr = 0, ss = 0;
};

} // namespace

struct blind_gauge::impl {
    explicit impl(const signal_set& set) : scale(std::sqrt(set.es())), grid(set.points())
    {
        double least = 1, most = 0;
        for (std::size_t i = 0; i < set.size(); ++i) {
            points.push_back(set.points()[i] / scale);
            log_prior.push_back(std::log(set.priors()[i]));
            mean += set.priors()[i] * points[i];
            least = std::min(least, set.priors()[i]);
            most = std::max(most, set.priors()[i]);
            everyone.push_back(static_cast<std::uint16_t>(i));
        }
        reach = negligible + std::log(most / least);
    }

    const std::vector<std::uint16_t>&
    near(complex place, double radius2, std::vector<std::uint16_t>& found) const;
    double log_likelihood(const std::vector<complex>& samples, std::size_t n, const state& at) const;
    evaluation evaluate(const std::vector<complex>& samples, const state& at) const;
    state best_start(const std::vector<complex>& samples, std::vector<state> starts) const;
    std::optional<evaluation> climb(const std::vector<complex>& samples, const state& from) const;

    double scale; // √Es: points are kept at unit energy
    point_grid grid;
    std::vector<complex> points;
    std::vector<double> log_prior;
    std::vector<std::uint16_t> everyone;
    complex mean;
    double reach; // in units of N0: how much farther than the nearest a point may be
};

/// Points not farther from `place` (unit energy) than the nearest one by more than radius2, squared; some
/// that are, too.
const std::vector<std::uint16_t>&
blind_gauge::impl::near(complex place, double radius2, std::vector<std::uint16_t>& found) const
{
    if (points.size() <= all_points)
        return everyone;
    found.clear();
    double nearest = 1e300;
    std::size_t looked_at = 0;
    for (int ring = 0; grid.ring(place * scale, ring, found); ++ring) {
        for (; looked_at < found.size(); ++looked_at)
            nearest = std::min(nearest, std::norm(place - points[found[looked_at]]));
        const double cleared = grid.cleared(ring) / scale;
        if (cleared * cleared > nearest + radius2)
            break;
    }
    return found;
}

double
blind_gauge::impl::log_likelihood(const std::vector<complex>& samples, std::size_t n, const state& at) const
{
    const double n0 = at.n0(), radius2 = reach * n0 / std::norm(at.gain);
    std::vector<std::uint16_t> found;
    double sum = 0;
    for (std::size_t k = 0; k < n; ++k) {
        double best = -1e300, total = 0; // the largest term apart: nothing overflows, nothing vanishes
        for (const auto i : near((samples[k] - at.offset) / at.gain, radius2, found)) {
            const double l = log_prior[i] - std::norm(samples[k] - at.gain * points[i] - at.offset) / n0;
            if (l < best - reach)
                continue;
            if (l > best) {
                total = total * std::exp(best - l) + 1;
                best = l;
            } else {
                total += std::exp(l - best);
            }
        }
        sum += best + std::log(total);
    }
    return sum - static_cast<double>(n) * at.log_n0;
}

evaluation blind_gauge::impl::evaluate(const std::vector<complex>& samples, const state& at) const
{
    evaluation out;
    out.at = at;
    const double n0 = at.n0(), n = static_cast<double>(samples.size()),
                 radius2 = reach * n0 / std::norm(at.gain);
    std::vector<std::uint16_t> found;
    std::vector<double> weight(points.size());
    std::vector<complex> error(points.size());
    complex sum_s;
    matrix spread{}; // Σ over samples of the posterior covariance of one symbol's gradient
    for (const auto& r : samples) {
        const auto& candidates = near((r - at.offset) / at.gain, radius2, found);
        const std::size_t count = candidates.size();
        double best = -1e300;
        for (std::size_t c = 0; c < count; ++c) {
            const auto i = candidates[c];
            error[c] = r - at.gain * points[i] - at.offset;
            weight[c] = log_prior[i] - std::norm(error[c]) / n0;
            best = std::max(best, weight[c]);
        }
        double total = 0;
        for (std::size_t c = 0; c < count; ++c)
            total += weight[c] = weight[c] < best - reach ? 0 : std::exp(weight[c] - best);
        out.log_likelihood += best + std::log(total);

        vector mean_gradient{};
        matrix products{};
        complex s;
        double ss = 0;
        for (std::size_t c = 0; c < count; ++c) {
            if (weight[c] == 0)
                continue;
            const double w = weight[c] / total;
            const complex p = points[candidates[c]], e = error[c];
            const complex q{e.real() * p.real() + e.imag() * p.imag(),
                            e.imag() * p.real() - e.real() * p.imag()};
            const vector g{2 * q.real() / n0,
                           2 * q.imag() / n0,
                           2 * e.real() / n0,
                           2 * e.imag() / n0,
                           std::norm(e) / n0 - 1};
            for (std::size_t i = 0; i < unknowns; ++i) {
                const double wg = w * g[i];
                mean_gradient[i] += wg;
                for (std::size_t j = 0; j <= i; ++j)
                    products[i][j] += wg * g[j];
            }
            s += w * p;
            ss += w * std::norm(p);
        }
        for (std::size_t i = 0; i < unknowns; ++i) {
            out.gradient[i] += mean_gradient[i];
            for (std::size_t j = 0; j <= i; ++j)
                spread[i][j] += products[i][j] - mean_gradient[i] * mean_gradient[j];
        }
        out.r += r;
        out.rr += std::norm(r);
        out.rs += r * std::conj(s);
        out.s += s;
        out.ss += ss;
    }
    out.log_likelihood -= n * at.log_n0;

    // Minus the mean second derivatives, were the points known; those with ln N0 are the gradient itself.
    matrix known{};
    known[0][0] = known[1][1] = 2 * out.ss / n0;
    known[2][2] = known[3][3] = 2 * n / n0;
    known[2][0] = known[3][1] = 2 * out.s.real() / n0;
    known[3][0] = 2 * out.s.imag() / n0;
    known[2][1] = -2 * out.s.imag() / n0;
    for (std::size_t j = 0; j < 4; ++j)
        known[4][j] = out.gradient[j];
    known[4][4] = out.gradient[4] + n;
    for (std::size_t i = 0; i < unknowns; ++i)
        for (std::size_t j = 0; j <= i; ++j)
            out.information[i][j] = out.information[j][i] = known[i][j] - spread[i][j];
    return out;
}

namespace {

/// The step of expectation-maximisation: least squares against posterior means.
state maximised(const evaluation& e, double n)
{
    const complex r = e.r / n, s = e.s / n;
    const complex g = (e.rs - n * r * std::conj(s)) / (e.ss - n * std::norm(s));
    const complex o = r - g * s;
    const double residual = e.rr + std::norm(g) * e.ss + n * std::norm(o) -
                            2 * std::real(std::conj(g) * e.rs) - 2 * std::real(std::conj(o) * e.r) +
                            2 * std::real(std::conj(o) * g * e.s);
    return {g, o, std::log(std::max(residual / n, 1e-300))};
}

} // namespace

state blind_gauge::impl::best_start(const std::vector<complex>& samples, std::vector<state> starts) const
{
    complex r;
    for (const auto& x : samples)
        r += x;
    r /= static_cast<double>(samples.size());
    for (int db = 0; db <= 48; db += 2) {
        const double gamma = std::pow(10, db / 10.), n0 = 1 / (1 + gamma);
        starts.push_back({std::sqrt(gamma * n0), 0, std::log(n0)});
        // The same with the mean taken as it is; of the power, what is spread about the mean.
        const double spread = 1 - std::norm(r), of_points = 1 - std::norm(mean);
        const double by_spread = std::sqrt(spread / (of_points + 1 / gamma));
        starts.push_back({by_spread, r - by_spread * mean, std::log(by_spread * by_spread / gamma)});
    }
    const auto n = std::min(samples.size(), samples_to_start);
    const state* best = nullptr;
    double most = 0;
    for (const auto& start : starts) {
        const double l = log_likelihood(samples, n, start);
        if (std::isfinite(l) && (!best || l > most)) {
            best = &start;
            most = l;
        }
    }
    return best ? *best : starts.front();
}

std::optional<evaluation> blind_gauge::impl::climb(const std::vector<complex>& samples,
                                                   const state& from) const
{
    const double n = static_cast<double>(samples.size());
    auto here = evaluate(samples, from);
    for (int step = 0; step < most_steps; ++step) {
        if (!std::isfinite(here.log_likelihood) || here.at.log_n0 < std::log(least_noise))
            return std::nullopt;
        const auto l = factor(here.information);
        if (l) {
            const auto y = forward(*l, here.gradient);
            if (square(y) < converged)
                return here;
            auto there = evaluate(samples, moved(here.at, backward(*l, y)));
            if (there.log_likelihood > here.log_likelihood) {
                here = std::move(there);
                continue;
            }
            // So close that rounding decides which is higher.
            if (square(y) < 1e3 * converged)
                return here;
        }
        here = evaluate(samples, maximised(here, n));
    }
    return std::nullopt;
}

blind_gauge::blind_gauge(const signal_set& set) : d(std::make_unique<impl>(set)) {}
blind_gauge::~blind_gauge() = default;
blind_gauge::blind_gauge(blind_gauge&&) noexcept = default;

std::optional<blind_result> blind_gauge::solve(const std::vector<std::complex<float>>& samples,
                                               const std::vector<blind_start>& starts) const
{
    if (samples.size() < least_samples)
        return std::nullopt;
    double power = 0;
    for (const auto& r : samples)
        power += std::norm(complex(r));
    const double rms = std::sqrt(power / static_cast<double>(samples.size()));
    if (!(rms > 0 && std::isfinite(rms)))
        return std::nullopt;

    // At unit power, against points of unit energy.
    std::vector<complex> scaled;
    scaled.reserve(samples.size());
    for (const auto& r : samples)
        scaled.push_back(complex(r) / rms);
    std::vector<state> from;
    for (const auto& s : starts)
        from.push_back({s.gain * d->scale / rms, s.offset / rms, std::log(s.n0 / (rms * rms))});
    const double unit = d->scale / rms; // what the detector stands for
    for (int db = 4; db <= 40; db += 4)
        from.push_back({unit, 0, std::log(unit * unit) - db / db_of_natural});

    const auto top = d->climb(scaled, d->best_start(scaled, std::move(from)));
    if (!top)
        return std::nullopt;
    const auto& at = top->at;
    const double g2 = std::norm(at.gain);
    const auto y =
        forward(*factor(top->information), {2 * at.gain.real() / g2, 2 * at.gain.imag() / g2, 0, 0, -1});
    const double se = db_of_natural * std::sqrt(square(y)); // ln γ = ln|g|² + ln Es − ln N0
    if (!(se <= largest_se))
        return std::nullopt;
    return blind_result{
        at.gain * rms / d->scale, at.offset * rms, at.n0() * rms * rms, g2 / at.n0(), se, samples.size()};
}

} // namespace halfplane
