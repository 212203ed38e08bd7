// SPDX-License-Identifier: GPL-3.0-or-later
// mixture_laws: channels of finitely many states, impulsive noise among them, and diversity.
#include "halfplane/law.h"

#include <algorithm>
#include <cmath>
#include <sstream>
#include <stdexcept>

namespace halfplane {

namespace {

void likeliest_first(std::vector<channel_state>& states)
{
    std::stable_sort(states.begin(), states.end(), [](const channel_state& a, const channel_state& b) {
        return a.probability > b.probability;
    });
}

std::vector<channel_state> checked(std::vector<channel_state> states)
{
    double sum = 0;
    for (std::size_t k = 0; k < states.size(); ++k) {
        const auto& s = states[k];
        if (!(s.probability > 0 && s.gain > 0 && std::isfinite(s.probability) && std::isfinite(s.gain))) {
            std::ostringstream text;
            text << "state " << k << " of a mixture needs a probability and a gain above 0, got "
                 << s.probability << " and " << s.gain;
            throw std::invalid_argument(text.str());
        }
        sum += s.probability;
    }
    if (!(std::abs(sum - 1) <= 1e-9)) {
        std::ostringstream text;
        text.precision(12);
        text << "the probabilities of a mixture must sum to 1, they sum to " << sum;
        throw std::invalid_argument(text.str());
    }
    likeliest_first(states);
    return states;
}

std::string impulsive_name(double a, double gamma)
{
    std::ostringstream text;
    text << "impulsive:" << a << ':' << gamma;
    return text.str();
}

std::vector<channel_state> class_a(double a, double gamma)
{
    if (!(a >= 1e-4 && a <= 100 && gamma >= 1e-9 && gamma <= 1e9))
        throw std::invalid_argument("A of the impulsive law must lie between 1e-4 and 100 and GAMMA between "
                                    "1e-9 and 1e9, got " +
                                    impulsive_name(a, gamma));
    // Far in the tail a rate lives on improbable states of strong noise, so none is left out that a double
    // can still hold.
    std::vector<channel_state> states;
    double ln_probability = -a;
    for (int k = 0; k < 2000; ++k) {
        const double p = std::exp(ln_probability);
        if (p > 0)
            states.push_back({p, (1 + gamma) / (k / a + gamma)});
        else if (k > a)
            break;
        ln_probability += std::log(a / (k + 1));
    }
    return states;
}

/// All sums of the gains of `branches` independent branches, or nothing where they are too many to list.
std::vector<channel_state> combined(const std::vector<channel_state>& branch, unsigned branches)
{
    std::vector<channel_state> sums{{1.0, 0.0}};
    for (unsigned l = 0; l < branches; ++l) {
        std::vector<channel_state> next;
        for (const auto& s : sums)
            for (const auto& b : branch)
                next.push_back({s.probability * b.probability, s.gain + b.gain});
        std::sort(next.begin(), next.end(), [](const channel_state& a, const channel_state& b) {
            return a.gain < b.gain;
        });
        sums.clear();
        for (const auto& n : next)
            if (!sums.empty() && n.gain - sums.back().gain <= 1e-14 * n.gain)
                sums.back().probability += n.probability;
            else
                sums.push_back(n);
        if (sums.size() > 4096)
            return {};
    }
    likeliest_first(sums);
    return sums;
}

} // namespace

mixture::mixture(std::vector<channel_state> states, std::string name)
    : d_states(checked(std::move(states))), d_name(std::move(name))
{
}

double mixture::tail(double u) const
{
    double sum = 0;
    for (const auto& s : d_states)
        sum += s.probability * std::exp(-s.gain * u);
    return sum;
}

double mixture::ln_tail(double u) const
{
    double least = INFINITY;
    for (const auto& s : d_states)
        least = std::min(least, s.gain * u - std::log(s.probability));
    double sum = 0;
    for (const auto& s : d_states)
        sum += std::exp(least - s.gain * u + std::log(s.probability));
    return std::log(sum) - least;
}

impulsive::impulsive(double a, double gamma) : mixture(class_a(a, gamma), impulsive_name(a, gamma)) {}

std::string impulsive::map_refusal() const
{
    return "MAP decisions under the law " + name() +
           " have no straight borders (one line between two points may be crossed three times), so unequal "
           "priors cannot be analysed with it: take equal priors or the ml detector";
}

diversity::diversity(std::shared_ptr<const law> branch, unsigned branches)
    : d_branch(std::move(branch)), d_branches(branches)
{
    if (!d_branch)
        throw std::invalid_argument("diversity needs the law of a branch");
    if (branches < 1 || branches > greatest_branches)
        throw std::invalid_argument("diversity takes 1 to 64 branches, got " + std::to_string(branches));
    if (!d_branch->map_refusal().empty())
        throw std::invalid_argument("branches under the law " + d_branch->name() +
                                    " cannot be combined: the detector does not know the noise of each");
    if (!d_branch->states().empty())
        d_states = combined(d_branch->states(), branches);
}

std::string diversity::name() const
{
    return d_branch->name() + "*" + std::to_string(d_branches);
}

double diversity::tail(double u) const
{
    return std::exp(ln_tail(u));
}

double diversity::ln_tail(double u) const
{
    return d_branches * d_branch->ln_tail(u);
}

double diversity::density(double g, unsigned branches) const
{
    return d_branch->density(g, branches * d_branches);
}

} // namespace halfplane
