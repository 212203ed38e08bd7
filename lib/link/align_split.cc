// SPDX-License-Identifier: GPL-3.0-or-later
// align_split: sums of log-likelihood ratios from either end.
#include "align_split.h"

#include <algorithm>

namespace halfplane::link {

namespace {

/// Odds of e^5 to one decide on which side of a split a symbol lies; what is less sure is excluded.
constexpr double certainty = 5;

std::vector<double> evidence(reference& ref,
                             const ring<sample>& fitted,
                             const alignment& a,
                             double coefficient,
                             std::uint64_t begin,
                             std::uint64_t end)
{
    const signal_set& set = ref.set();
    std::vector<std::uint16_t> sent(end - begin);
    ref.read(a, begin, sent.size(), sent.data());
    const double rho2 = coefficient * coefficient;
    const double noise = std::max(set.es() * (1 / rho2 - 1), set.d_min() * set.d_min() / 16);
    const double apart = noise + 2 * (set.es() - std::norm(set.mean()));
    std::vector<double> llr(sent.size());
    for (std::size_t k = 0; k < llr.size(); ++k) {
        const double e = std::norm(complex(fitted[begin + k]) - set.points()[sent[k]]);
        llr[k] = std::isfinite(e) ? std::max(std::log(apart / noise) + e / apart - e / noise, -10.0) : 0.0;
    }
    return llr;
}

/// How many values from the first on are needed until their sum is within `certainty` of the highest it
/// reaches.
template <typename Iterator>
std::size_t values_to_the_peak(Iterator first, Iterator last)
{
    double sum = 0, most = 0;
    for (auto l = first; l != last; ++l)
        most = std::max(most, sum += *l);
    sum = 0;
    auto l = first;
    for (; l != last && sum < most - certainty; ++l)
        sum += *l;
    return static_cast<std::size_t>(l - first);
}

} // namespace

std::uint64_t last_of_old(reference& ref,
                          const ring<sample>& fitted,
                          const alignment& old,
                          double coefficient,
                          std::uint64_t begin,
                          std::uint64_t end)
{
    const auto llr = evidence(ref, fitted, old, coefficient, begin, end);
    return begin + values_to_the_peak(llr.begin(), llr.end());
}

std::uint64_t first_of_new(reference& ref,
                           const ring<sample>& fitted,
                           const alignment& next,
                           double coefficient,
                           std::uint64_t begin,
                           std::uint64_t end)
{
    const auto llr = evidence(ref, fitted, next, coefficient, begin, end);
    return end - values_to_the_peak(llr.rbegin(), llr.rend());
}

} // namespace halfplane::link
