// SPDX-License-Identifier: GPL-3.0-or-later
// signal_set: points, labels and priors of a two-dimensional constellation, as one immutable value.
#pragma once

#include <complex>
#include <cstddef>
#include <cstdint>
#include <stdexcept>
#include <string>
#include <vector>

namespace halfplane {

using complex = std::complex<double>;
using label_t = std::uint16_t;

/// A constellation that cannot be used. The message names what is wrong, the index and the value.
class invalid_set : public std::invalid_argument
{
public:
    using std::invalid_argument::invalid_argument;
};

/// Number of bits in which two labels differ (Hamming distance).
unsigned label_distance(label_t a, label_t b) noexcept;

/*!
 * M points with distinct labels and priors.
 *
 * The *index* of a point is its place in the set, 0 … M−1; its *label* is the bits it carries. The two are
 * never mixed: every function says which one it takes. Points are kept exactly as given; nothing rescales
 * them unless scaled() is called.
 */
class signal_set
{
public:
    static constexpr std::size_t min_size = 2;
    static constexpr std::size_t max_size = 4096;
    static constexpr unsigned max_label_bits = 12;
    /// Priors must sum to 1 within this; they are then divided by their sum.
    static constexpr double prior_tolerance = 1e-6;

    /*!
     * \param points     M complex points, 2 ≤ M ≤ 4096, finite, distinct, any units
     * \param labels     M distinct labels below 2^label_bits
     * \param label_bits bits of a label, 1 … 12; the leftmost bit is the most significant
     * \param priors     M positive probabilities that sum to 1, or empty for equal priors
     * \param name, note free text
     * \throws invalid_set naming the index and the value that is refused
     */
    signal_set(std::vector<complex> points,
               std::vector<label_t> labels,
               unsigned label_bits,
               std::vector<double> priors = {},
               std::string name = {},
               std::string note = {});

    /// Points with natural labels (label = index) of ⌈log2 M⌉ bits and equal priors.
    static signal_set with_natural_labels(std::vector<complex> points, std::string name = {});

    std::size_t size() const noexcept { return d_points.size(); }
    unsigned label_bits() const noexcept { return d_label_bits; }
    const std::vector<complex>& points() const noexcept { return d_points; }
    const std::vector<label_t>& labels() const noexcept { return d_labels; }
    const std::vector<double>& priors() const noexcept { return d_priors; }
    const std::string& name() const noexcept { return d_name; }
    const std::string& note() const noexcept { return d_note; }
    /// True when no priors were given, or all given ones are the same number.
    bool uniform() const noexcept { return d_uniform; }

    /// Label of point `index` as a string of label_bits() characters '0' and '1', leftmost bit first.
    std::string label_string(std::size_t index) const;
    /// Index of the point that carries `label`, or -1 where no point does. O(1).
    int index_of_label(unsigned label) const noexcept;

    /// Es: prior-weighted mean of |s|², in the square of the points' unit.
    double es() const noexcept { return d_es; }
    /// H: entropy of the priors in bits a symbol; log2 M when uniform.
    double entropy_bits() const noexcept { return d_entropy; }
    /// Eb = Es / H.
    double eb() const noexcept { return d_es / d_entropy; }
    /// Prior-weighted mean of the points.
    complex mean() const noexcept { return d_mean; }
    /// Peak over mean power, max|s|²/Es, in dB.
    double papr_db() const noexcept;
    /// Smallest distance between two points; computed on construction in O(M log M).
    double d_min() const noexcept { return d_d_min; }

    /// The same set with every point multiplied by `factor` (finite, not zero; else invalid_set).
    signal_set scaled(complex factor) const;
    /// The same set with every point moved by `offset`.
    signal_set translated(complex offset) const;
    /// The same points and priors under other labels.
    signal_set relabelled(std::vector<label_t> labels) const;
    /// The same points and labels under other priors (empty: equal).
    signal_set with_priors(std::vector<double> priors) const;
    signal_set renamed(std::string name, std::string note = {}) const;

private:
    std::vector<complex> d_points;
    std::vector<label_t> d_labels;
    std::vector<double> d_priors;
    std::vector<std::int16_t> d_index_of_label;
    std::string d_name, d_note;
    unsigned d_label_bits;
    bool d_uniform;
    double d_es, d_entropy, d_d_min;
    complex d_mean;
};

} // namespace halfplane
