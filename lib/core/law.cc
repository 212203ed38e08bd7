// SPDX-License-Identifier: GPL-3.0-or-later
// law: what laws share, and the law from its text.
#include "halfplane/law.h"

#include <cmath>
#include <functional>
#include <map>
#include <stdexcept>

namespace halfplane {

double law::ln_tail(double u) const
{
    return std::log(tail(u));
}

double law::density(double, unsigned) const
{
    throw std::logic_error("the law " + name() + " gives no density of its gain, which MAP decisions under " +
                           "unequal priors need");
}

const std::vector<channel_state>& law::states() const
{
    static const std::vector<channel_state> none;
    return none;
}

double awgn::tail(double u) const
{
    return std::exp(-u);
}

const std::vector<channel_state>& awgn::states() const
{
    static const std::vector<channel_state> only{{1.0, 1.0}};
    return only;
}

namespace {

std::vector<std::string> split(const std::string& text, char at)
{
    std::vector<std::string> parts(1);
    for (const char c : text)
        if (c == at)
            parts.emplace_back();
        else
            parts.back() += c;
    return parts;
}

double number(const std::string& text, const std::string& whole)
{
    try {
        std::size_t used = 0;
        const double x = std::stod(text, &used);
        if (used == text.size() && !text.empty())
            return x;
    } catch (const std::logic_error&) {
        // neither a number nor within the range of one
    }
    throw std::invalid_argument("'" + text + "' in the channel law '" + whole + "' is not a number");
}

using arguments = std::vector<double>;
struct entry {
    std::size_t count;
    const char* form;
    std::function<std::shared_ptr<const law>(const arguments&)> make;
};

/// A new law is entered here.
const std::map<std::string, entry>& entries()
{
    static const std::map<std::string, entry> table{
        {"awgn", {0, "awgn", [](const arguments&) { return std::make_shared<awgn>(); }}},
        {"rayleigh", {0, "rayleigh", [](const arguments&) { return std::make_shared<rayleigh>(); }}},
        {"rician", {1, "rician:K_DB", [](const arguments& a) { return std::make_shared<rician>(a[0]); }}},
        {"nakagami", {1, "nakagami:M", [](const arguments& a) { return std::make_shared<nakagami>(a[0]); }}},
        {"impulsive",
         {2,
          "impulsive:A:GAMMA",
          [](const arguments& a) { return std::make_shared<impulsive>(a[0], a[1]); }}},
    };
    return table;
}

} // namespace

std::shared_ptr<const law> parse_law(const std::string& text)
{
    const auto factors = split(text, '*');
    const auto parts = split(factors[0], ':');
    const auto found = entries().find(parts[0]);
    if (found == entries().end())
        throw std::invalid_argument("no channel law is called '" + parts[0] +
                                    "': write awgn, rayleigh, rician:K_DB, nakagami:M or impulsive:A:GAMMA");
    const entry& e = found->second;
    if (parts.size() - 1 != e.count)
        throw std::invalid_argument("the channel law '" + text + "' is to be written " + e.form);
    arguments values;
    for (std::size_t k = 1; k < parts.size(); ++k)
        values.push_back(number(parts[k], text));
    auto made = e.make(values);
    if (factors.size() == 1)
        return made;
    const double branches = factors.size() == 2 ? number(factors[1], text) : 0;
    if (!(branches >= 1 && branches <= diversity::greatest_branches && branches == std::floor(branches)))
        throw std::invalid_argument("the channel law '" + text +
                                    "' needs one whole number of branches from 1 to 64 after '*'");
    return std::make_shared<diversity>(std::move(made), static_cast<unsigned>(branches));
}

} // namespace halfplane
