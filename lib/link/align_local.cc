// SPDX-License-Identifier: GPL-3.0-or-later
// align_local: a short correlation over few delays, in windows of several lengths.
#include "align_local.h"

#include <algorithm>

namespace halfplane::link {

namespace {

constexpr std::size_t most_parts = 8;
/// n·ρ² that noise reaches with chance e^-32 a trial; a doubt makes fewer than 1e5 trials.
constexpr double evidence = 32;

} // namespace

void local_search::restart(std::uint64_t from, double usual_coefficient)
{
    d_next = from;
    d_usual = usual_coefficient;
    d_parts.clear();
}

std::optional<local_search::answer>
local_search::look(const ring<sample>& y, const alignment& a, std::uint64_t end)
{
    std::optional<answer> found;
    for (; end >= d_next + block && !found; d_next += block) {
        add_block(y, a);
        found = best();
    }
    return found;
}

void local_search::add_block(const ring<sample>& y, const alignment& a)
{
    constexpr std::size_t span = block + 2 * widest;
    std::array<std::uint16_t, span> sent;
    std::array<sample, span> s;
    std::array<sample, block> z;
    d_ref.read(a, d_next - widest, span, sent.data());
    const sample mean(d_ref.set().mean());
    for (std::size_t k = 0; k < span; ++k)
        s[k] = d_ref.points()[sent[k]] - mean;

    complex sum{};
    for (std::size_t k = 0; k < block; ++k) {
        z[k] = usable(y[d_next + k]) ? y[d_next + k] : sample{};
        sum += z[k];
    }
    const sample level(sum / static_cast<double>(block));
    part p{};
    for (std::size_t k = 0; k < block; ++k) {
        z[k] -= usable(y[d_next + k]) ? level : sample{};
        p.received += energy(z[k]);
    }
    for (std::size_t d = 0; d < p.cross.size(); ++d) {
        float re = 0, im = 0;
        for (std::size_t k = 0; k < block; ++k) {
            const sample x = times_conj(z[k], s[k + d]);
            re += x.real();
            im += x.imag();
        }
        p.cross[d] = {re, im};
    }
    d_parts.push_front(p);
    if (d_parts.size() > most_parts)
        d_parts.pop_back();
}

std::optional<local_search::answer> local_search::best() const
{
    const double es = d_ref.set().es() - std::norm(d_ref.set().mean());
    for (std::size_t parts = 1; parts <= d_parts.size(); parts *= 2) {
        const double n = static_cast<double>(parts * block);
        double received = 0;
        std::array<complex, 2 * widest + 1> cross{};
        for (std::size_t p = 0; p < parts; ++p) {
            received += d_parts[p].received;
            for (std::size_t d = 0; d < cross.size(); ++d)
                cross[d] += d_parts[p].cross[d];
        }
        if (!(received > 0))
            continue;
        const auto top = std::max_element(
            cross.begin(), cross.end(), [](complex u, complex v) { return std::norm(u) < std::norm(v); });
        const double rho2 = std::norm(*top) / (received * n * es);
        const int shift = static_cast<int>(top - cross.begin()) - widest;
        // Patterns resemble themselves a little at other delays: a new delay must do about as well as the old
        // one did.
        if (rho2 * n < evidence || (shift != 0 && rho2 < 0.25 * d_usual * d_usual))
            continue;
        return answer{shift, *top / (n * es), std::min(1.0, std::sqrt(rho2)), parts * block};
    }
    return std::nullopt;
}

} // namespace halfplane::link
