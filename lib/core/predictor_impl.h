// SPDX-License-Identifier: GPL-3.0-or-later
// predictor_impl: what a predictor keeps, and the way from Es/N0 to summed wedges.
#pragma once

#include "rate_sums.h"
#include "scene.h"

#include "halfplane/rates.h"

#include <functional>
#include <memory>
#include <vector>

namespace halfplane {

/// Cells, walls and scene of one power diagram, tied together so that the scene's pointers stay good.
class diagram
{
public:
    /*!
     * \param set     points in the detector's plane
     * \param weights of the power diagram, empty for the nearest point
     * \param whiten  from the detector's plane to the one in which the noise is circular, or null
     */
    diagram(const signal_set& set, std::vector<double> weights, const matrix2* whiten);
    diagram(const diagram&) = delete;
    diagram& operator=(const diagram&) = delete;

    /// An arrival at `mean`, in the detector's plane.
    arrival arriving(std::size_t sent, complex mean, double weight) const;
    /// The same for any mean, split in two where it lies on a border; `deviation` of the noise in one
    /// dimension.
    void add_arrival(
        std::size_t sent, complex mean, double weight, double deviation, std::vector<arrival>& out) const;
    /// A scene with other arrivals.
    scene displaced(std::vector<arrival> arrivals) const;

    cells regions;
    wall_map walls;
    std::unique_ptr<repetitions> repeated;
    scene view;

private:
    /// Distance from a mean (in the plane of the edges) to the nearest border line of its owner.
    double room(std::size_t owner, complex mean) const;
    bool moved() const { return d_whiten || !view.weights.empty(); }
    const matrix2* d_whiten;
};

struct predictor::impl {
    impl(signal_set s, std::shared_ptr<const law> c, detector r, noise_shape shape);

    /// All asked figures, averaged over the channel.
    rate_sums at(double es_n0, unsigned parts) const;
    /// The same for other arrivals, means in the unit of the given set.
    rate_sums displaced(double es_n0, const std::vector<displaced_point>& arrivals, unsigned parts) const;
    /// P(j|i) for all j and the given i, row after row.
    std::vector<double> rows(double es_n0, const std::vector<std::size_t>& sent) const;
    double ln_rate(double es_n0, rung_name r, bool bits) const;
    void require_index(std::size_t i) const;
    /// The diagram at this N0: the kept one, or `made` filled with a new one.
    const diagram& diagram_at(double es_n0, std::unique_ptr<diagram>& made) const;

    signal_set given;
    detector rule;
    std::shared_ptr<const law> channel;
    double scale;                    // given points times this have magnitude 1
    double es;                       // of the scaled points
    std::unique_ptr<matrix2> shaped; // given plane to the one in which the noise is circular
    matrix2 to_detector;             // scaled given plane to the detector's
    signal_set set;                  // in the detector's plane
    std::unique_ptr<matrix2> whiten; // detector's plane to the one in which the noise is circular
    std::unique_ptr<diagram> fixed;  // where cells do not depend on N0

private:
    using figures = std::function<rate_sums(const diagram&, const noise&)>;
    rate_sums averaged(double es_n0, const figures& f) const;
    bool moving() const { return rule == detector::map && !given.uniform(); }
    noise gaussian(double es_n0) const;
};

/// \throws std::invalid_argument unless es_n0 is finite and above 0
void require_es_n0(double es_n0);

} // namespace halfplane
