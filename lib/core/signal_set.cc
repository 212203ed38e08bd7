// SPDX-License-Identifier: GPL-3.0-or-later
// signal_set: validation and the facts that every other part asks for.
#include "halfplane/signal_set.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <sstream>

namespace halfplane {

namespace {

template <typename... Parts>
[[noreturn]] void refuse(const Parts&... parts)
{
    std::ostringstream text;
    text.precision(10);
    (text << ... << parts);
    throw invalid_set(text.str());
}

std::string shown(complex z)
{
    std::ostringstream text;
    text.precision(10);
    text << '(' << z.real() << ", " << z.imag() << ')';
    return text.str();
}

bool finite(complex z)
{
    return std::isfinite(z.real()) && std::isfinite(z.imag());
}

/// Indices in the order of (real, imaginary): equal points become neighbours, near ones close.
std::vector<std::size_t> sorted_by_real(const std::vector<complex>& points)
{
    std::vector<std::size_t> order(points.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return points[a].real() != points[b].real() ? points[a].real() < points[b].real()
                                                    : points[a].imag() < points[b].imag();
    });
    return order;
}

void require_distinct(const std::vector<complex>& points, const std::vector<std::size_t>& order)
{
    for (std::size_t k = 1; k < order.size(); ++k)
        if (points[order[k]] == points[order[k - 1]])
            refuse("point ",
                   std::max(order[k], order[k - 1]),
                   " equals point ",
                   std::min(order[k], order[k - 1]),
                   ": ",
                   shown(points[order[k]]));
}

/// Closest pair by divide and conquer over the points in order of their real part (Shamos and Hoey, 1975).
double closest_distance(const std::vector<complex>& points, const std::size_t* first, std::size_t n)
{
    if (n <= 3) {
        double best = std::numeric_limits<double>::infinity();
        for (std::size_t a = 0; a < n; ++a)
            for (std::size_t b = a + 1; b < n; ++b)
                best = std::min(best,
                                std::hypot(points[first[a]].real() - points[first[b]].real(),
                                           points[first[a]].imag() - points[first[b]].imag()));
        return best;
    }
    const std::size_t half = n / 2;
    const double middle = points[first[half]].real();
    double best =
        std::min(closest_distance(points, first, half), closest_distance(points, first + half, n - half));

    std::vector<complex> strip;
    for (std::size_t k = 0; k < n; ++k)
        if (std::abs(points[first[k]].real() - middle) < best)
            strip.push_back(points[first[k]]);
    std::sort(strip.begin(), strip.end(), [](complex a, complex b) { return a.imag() < b.imag(); });
    for (std::size_t a = 0; a < strip.size(); ++a)
        for (std::size_t b = a + 1; b < strip.size() && strip[b].imag() - strip[a].imag() < best; ++b)
            best = std::min(best,
                            std::hypot(strip[a].real() - strip[b].real(), strip[a].imag() - strip[b].imag()));
    return best;
}

} // namespace

unsigned label_distance(label_t a, label_t b) noexcept
{
    return static_cast<unsigned>(__builtin_popcount(static_cast<unsigned>(a ^ b)));
}

signal_set::signal_set(std::vector<complex> points,
                       std::vector<label_t> labels,
                       unsigned label_bits,
                       std::vector<double> priors,
                       std::string name,
                       std::string note)
    : d_points(std::move(points)), d_labels(std::move(labels)), d_priors(std::move(priors)),
      d_name(std::move(name)), d_note(std::move(note)), d_label_bits(label_bits)
{
    const std::size_t m = d_points.size();
    if (m < min_size)
        refuse("a set needs at least ", min_size, " points, got ", m);
    if (m > max_size)
        refuse("a set has at most ", max_size, " points, got ", m);
    for (std::size_t i = 0; i < m; ++i)
        if (!finite(d_points[i]))
            refuse("point ", i, " is not finite: ", shown(d_points[i]));
    const auto order = sorted_by_real(d_points);
    require_distinct(d_points, order);

    if (label_bits < 1 || label_bits > max_label_bits)
        refuse("labels have 1 to ", max_label_bits, " bits, got ", label_bits);
    if (d_labels.size() != m)
        refuse("as many labels as points are needed: ", d_labels.size(), " labels for ", m, " points");
    d_index_of_label.assign(std::size_t{1} << label_bits, -1);
    for (std::size_t i = 0; i < m; ++i) {
        if (d_labels[i] >> label_bits)
            refuse("label of point ", i, " has more than ", label_bits, " bits: ", d_labels[i]);
        auto& place = d_index_of_label[d_labels[i]];
        if (place >= 0)
            refuse("points ", place, " and ", i, " share the label ", label_string(i));
        place = static_cast<std::int16_t>(i);
    }

    d_uniform = d_priors.empty();
    if (d_uniform)
        d_priors.assign(m, 1.0 / static_cast<double>(m));
    if (d_priors.size() != m)
        refuse("as many priors as points are needed: ", d_priors.size(), " priors for ", m, " points");
    double sum = 0;
    for (std::size_t i = 0; i < m; ++i) {
        if (!std::isfinite(d_priors[i]) || d_priors[i] <= 0)
            refuse("prior of point ", i, " must be a positive number, got ", d_priors[i]);
        sum += d_priors[i];
    }
    if (std::abs(sum - 1) > prior_tolerance)
        refuse("priors must sum to 1 within ", prior_tolerance, ", they sum to ", sum);
    d_uniform = d_uniform || std::all_of(d_priors.begin(), d_priors.end(), [&](double p) {
                    return p == d_priors.front();
                });
    // What sums to 1 within rounding stays as it is, so that a written set reads back as the same numbers.
    const double rounding = 4 * static_cast<double>(m) * std::numeric_limits<double>::epsilon();
    const double divisor = std::abs(sum - 1) <= rounding ? 1 : sum;
    for (double& p : d_priors)
        p = d_uniform ? 1.0 / static_cast<double>(m) : p / divisor;

    d_es = 0;
    d_mean = 0;
    d_entropy = 0;
    for (std::size_t i = 0; i < m; ++i) {
        d_es += d_priors[i] * std::norm(d_points[i]);
        d_mean += d_priors[i] * d_points[i];
        d_entropy -= d_priors[i] * std::log2(d_priors[i]);
    }
    if (d_uniform)
        d_entropy = std::log2(static_cast<double>(m));
    if (!std::isfinite(d_es) || d_es < std::numeric_limits<double>::min())
        refuse("the mean energy of the points leaves the range of a double: ", d_es, "; scale the points");
    d_d_min = closest_distance(d_points, order.data(), m);
}

signal_set signal_set::with_natural_labels(std::vector<complex> points, std::string name)
{
    const std::size_t m = points.size();
    unsigned bits = 1;
    while ((std::size_t{1} << bits) < m && bits < max_label_bits)
        ++bits;
    std::vector<label_t> labels(m);
    std::iota(labels.begin(), labels.end(), label_t{0});
    return {std::move(points), std::move(labels), bits, {}, std::move(name)};
}

std::string signal_set::label_string(std::size_t index) const
{
    std::string text(d_label_bits, '0');
    for (unsigned k = 0; k < d_label_bits; ++k)
        if (d_labels.at(index) >> (d_label_bits - 1 - k) & 1)
            text[k] = '1';
    return text;
}

int signal_set::index_of_label(unsigned label) const noexcept
{
    return label < d_index_of_label.size() ? d_index_of_label[label] : -1;
}

double signal_set::papr_db() const noexcept
{
    double peak = 0;
    for (const auto& s : d_points)
        peak = std::max(peak, std::norm(s));
    return 10 * std::log10(peak / d_es);
}

signal_set signal_set::scaled(complex factor) const
{
    if (!finite(factor) || factor == complex{})
        refuse("a set cannot be scaled by ", shown(factor));
    auto points = d_points;
    for (auto& s : points)
        s *= factor;
    return {std::move(points),
            d_labels,
            d_label_bits,
            d_uniform ? std::vector<double>{} : d_priors,
            d_name,
            d_note};
}

signal_set signal_set::translated(complex offset) const
{
    auto points = d_points;
    for (auto& s : points)
        s += offset;
    return {std::move(points),
            d_labels,
            d_label_bits,
            d_uniform ? std::vector<double>{} : d_priors,
            d_name,
            d_note};
}

signal_set signal_set::relabelled(std::vector<label_t> labels) const
{
    return {d_points,
            std::move(labels),
            d_label_bits,
            d_uniform ? std::vector<double>{} : d_priors,
            d_name,
            d_note};
}

signal_set signal_set::with_priors(std::vector<double> priors) const
{
    return {d_points, d_labels, d_label_bits, std::move(priors), d_name, d_note};
}

signal_set signal_set::renamed(std::string name, std::string note) const
{
    return {d_points,
            d_labels,
            d_label_bits,
            d_uniform ? std::vector<double>{} : d_priors,
            std::move(name),
            std::move(note)};
}

} // namespace halfplane
