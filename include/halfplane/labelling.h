// SPDX-License-Identifier: GPL-3.0-or-later
// labelling: a search for labels with few bit errors, for sets that have no Gray labelling.
#pragma once

#include "halfplane/signal_set.h"

#include <cstdint>
#include <vector>

namespace halfplane {

struct labelling_search {
    double es_n0;                   ///< linear, > 0: the BER is minimised here
    std::uint64_t seed = 1;         ///< the same seed, the same labels
    unsigned restarts = 8;          ///< runs from random labels, after one from the labels given
    unsigned steps_a_point = 20000; ///< exchanges tried in one run, per point
};

/*!
 * Labels, by index, of a lower or the same exact BER over AWGN as the set's own. Simulated annealing
 * (Kirkpatrick, Gelatt and Vecchi, Science 220 (1983) 671) on Σ p_i · P(j|i) · h_ij, exchanging labels of two
 * points or a label with one that no point carries; good labels, not proven to be the best.
 * \throws std::invalid_argument unless es_n0 is finite and > 0
 */
std::vector<label_t> search_labels(const signal_set& set, const labelling_search& how);

} // namespace halfplane
