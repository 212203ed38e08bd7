// SPDX-License-Identifier: GPL-3.0-or-later
// shift_mixture: from which Gaussians the noise of rare errors is drawn, and what each draw weighs.
#pragma once

#include "halfplane/simulate.h"
#include "link_model.h"

#include <cstdint>
#include <vector>

namespace halfplane {

/*!
 * Components (point i, channel state s, shift a): the noise of point i in state s is drawn around a, which is
 * 0 or leads from the mean of i to the nearest point of one edge of cell i. A component is chosen in
 * proportion to p_i·P_s·exp(−|a|²/N0_s), the size of what lies beyond that edge, but for a share of `defence`
 * that goes to the unshifted ones in proportion to p_i·P_s: so no weight exceeds 1/defence.
 */
class shift_mixture
{
public:
    static constexpr double defence = 0.2;

    /// \throws std::invalid_argument where the errors are rarer than doubles can weigh
    shift_mixture(const link_model& link, const std::vector<channel_state>& states);

    struct component {
        std::uint16_t point;
        std::uint32_t group; ///< of (point, state)
        double n0;           ///< of the state
        complex shift;
    };
    /// The component for a uniform number in [0, 1).
    const component& pick(double uniform) const;
    /// p_i·P_s·density(noise) over Σ_k β_k·density(noise − a_k), k over the components of the group; divided
    /// by unit(), about the largest share, so that squares do not underflow.
    double weight(const component& from, complex noise) const;

    double unit() const noexcept { return d_unit; }

private:
    struct group {
        double prior; ///< p_i·P_s
        std::uint32_t first, last;
    };
    std::vector<component> d_components;
    std::vector<double> d_share, d_up_to;
    std::vector<group> d_groups;
    double d_unit = 1;
};

} // namespace halfplane
