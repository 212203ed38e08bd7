// SPDX-License-Identifier: GPL-3.0-or-later
// labelling: annealing over exchanges of labels, weighted by exact transition probabilities.
#include "halfplane/labelling.h"

#include "halfplane/rates.h"
#include "refusal.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace halfplane {

namespace {

/// SplitMix64: the same draws on every platform.
struct draws {
    std::uint64_t state;
    std::uint64_t next()
    {
        std::uint64_t z = state += 0x9e3779b97f4a7c15u;
        z = (z ^ z >> 30) * 0xbf58476d1ce4e5b9u;
        z = (z ^ z >> 27) * 0x94d049bb133111ebu;
        return z ^ z >> 31;
    }
    std::size_t below(std::size_t n) { return static_cast<std::size_t>((next() >> 32) * n >> 32); }
    double unit() { return static_cast<double>(next() >> 11) * 0x1p-53; }
};

struct neighbour {
    std::uint32_t index;
    double weight; ///< p_i·P(j|i) + p_j·P(i|j)
};

/// For each point those that errors lead to, down to 1e-7 of the most frequent error.
std::vector<std::vector<neighbour>> weights_of(const signal_set& set, double es_n0)
{
    const predictor exact(set, std::make_shared<awgn>(), detector::ml);
    const std::size_t m = set.size();
    std::vector<std::vector<double>> rows;
    for (std::size_t i = 0; i < m; ++i) {
        rows.push_back(exact.transition_row(es_n0, i));
        for (double& p : rows.back())
            p *= set.priors()[i];
    }
    double most = 0;
    for (std::size_t i = 0; i < m; ++i)
        for (std::size_t j = 0; j < i; ++j)
            most = std::max(most, rows[i][j] + rows[j][i]);
    std::vector<std::vector<neighbour>> all(m);
    for (std::size_t i = 0; i < m; ++i)
        for (std::size_t j = 0; j < m; ++j)
            if (i != j && rows[i][j] + rows[j][i] > 1e-7 * most)
                all[i].push_back({static_cast<std::uint32_t>(j), (rows[i][j] + rows[j][i]) / most});
    return all;
}

/// Places are points first, then the labels that no point carries.
class annealing
{
public:
    annealing(const std::vector<std::vector<neighbour>>& weights, std::vector<label_t> labels)
        : d_weights(weights), d_labels(std::move(labels)), d_best(d_labels), d_cost(cost()),
          d_best_cost(d_cost)
    {
    }

    void restart(const std::vector<label_t>& labels)
    {
        d_labels = labels;
        d_cost = cost();
    }

    void shuffle(draws& random)
    {
        for (std::size_t k = d_labels.size(); k > 1; --k)
            std::swap(d_labels[k - 1], d_labels[random.below(k)]);
        d_cost = cost();
    }

    /// From `hot` down to 1/100 of the most frequent error's weight; weights are in units of that.
    void run(draws& random, double hot, std::uint64_t steps)
    {
        constexpr double cold = 0.01;
        const double cooling = std::exp(std::log(cold / hot) / static_cast<double>(steps));
        double temperature = hot;
        for (std::uint64_t k = 0; k < steps; ++k, temperature *= cooling) {
            const std::size_t a = random.below(d_weights.size()), b = random.below(d_labels.size());
            const double change = change_of(a, b);
            if (change > 0 && random.unit() >= std::exp(-change / temperature))
                continue;
            std::swap(d_labels[a], d_labels[b]);
            d_cost += change;
            if (d_cost < d_best_cost * (1 - 1e-12)) {
                d_best_cost = d_cost;
                d_best = d_labels;
            }
        }
    }

    const std::vector<label_t>& best() const { return d_best; }

private:
    double cost_of(std::size_t i, label_t label, std::size_t but) const
    {
        if (i >= d_weights.size())
            return 0;
        double sum = 0;
        for (const auto& n : d_weights[i])
            if (n.index != but)
                sum += n.weight * label_distance(label, d_labels[n.index]);
        return sum;
    }

    /// The distance between a and b themselves stays as it is.
    double change_of(std::size_t a, std::size_t b) const
    {
        return a == b ? 0
                      : cost_of(a, d_labels[b], b) + cost_of(b, d_labels[a], a) - cost_of(a, d_labels[a], b) -
                            cost_of(b, d_labels[b], a);
    }

    double cost() const
    {
        double sum = 0;
        for (std::size_t i = 0; i < d_weights.size(); ++i)
            sum += cost_of(i, d_labels[i], i) / 2;
        return sum;
    }

    const std::vector<std::vector<neighbour>>& d_weights;
    std::vector<label_t> d_labels, d_best;
    double d_cost, d_best_cost;
};

} // namespace

std::vector<label_t> search_labels(const signal_set& set, const labelling_search& how)
{
    if (!(how.es_n0 > 0 && std::isfinite(how.es_n0)))
        detail::refuse<std::invalid_argument>("es_n0 must be a number above 0, got ", how.es_n0);
    auto labels = set.labels();
    for (unsigned label = 0; label < 1u << set.label_bits(); ++label)
        if (set.index_of_label(label) < 0)
            labels.push_back(static_cast<label_t>(label));

    const auto weights = weights_of(set, how.es_n0);
    const std::uint64_t steps = std::uint64_t{how.steps_a_point} * set.size();
    draws random{how.seed};
    annealing search(weights, labels);
    for (double hot : {0.05, 0.1, 0.2, 0.3}) { // near the labels given, ever farther from them
        search.restart(labels);
        search.run(random, hot, steps);
    }
    for (unsigned k = 0; k < how.restarts; ++k) {
        search.shuffle(random);
        search.run(random, 3, steps);
    }
    auto found = search.best();
    found.resize(set.size());
    // Weights were cut at 1e-7: the exact rate has the last word.
    const auto ber = [&](const signal_set& s) {
        return predictor(s, std::make_shared<awgn>(), detector::ml).ln_ber(how.es_n0);
    };
    return ber(set.relabelled(found)) < ber(set) ? found : set.labels();
}

} // namespace halfplane
