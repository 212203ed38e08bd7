// SPDX-License-Identifier: GPL-3.0-or-later
// law: what laws share, and the law from its text.
#include "halfplane/law.h"

#include <cmath>
#include <stdexcept>

namespace halfplane {

double law::ln_tail(double u) const
{
    return std::log(tail(u));
}

double law::density(double, unsigned) const
{
    throw std::logic_error("the law " + name() +
                           " gives no density of its gain, which MAP decisions under "
                           "unequal priors need");
}

const std::vector<channel_state> &law::states() const
{
    static const std::vector<channel_state> none;
    return none;
}

double awgn::tail(double u) const
{
    return std::exp(-u);
}

const std::vector<channel_state> &awgn::states() const
{
    static const std::vector<channel_state> only{{1.0, 1.0}};
    return only;
}

std::shared_ptr<const law> parse_law(const std::string &text)
{
    if (text == "awgn")
        return std::make_shared<awgn>();
    throw std::invalid_argument("no channel law is called '" + text + "'");
}

} // namespace halfplane
