// SPDX-License-Identifier: GPL-3.0-or-later
// standard_sets: 3GPP TS 38.211, ETSI EN 302 307-1, ETSI EN 302 755, IEEE 802.11.
//
// All that follows was written down from memory of the documents; the listing says so at each entry. The
// tests check what each document implies: unit energy, symmetry, Gray labels where it has them.
#include "standard_sets.h"

#include "families.h"
#include "rings.h"

#include <array>
#include <cmath>

namespace halfplane::detail {

namespace {

/// A set of 2^bits points where `point` maps a label to its point; index = label.
template <typename Mapping>
signal_set by_label(unsigned bits, Mapping point)
{
    std::vector<complex> points(std::size_t{1} << bits);
    std::vector<label_t> labels(points.size());
    for (std::size_t label = 0; label < points.size(); ++label) {
        points[label] = point(static_cast<unsigned>(label));
        labels[label] = static_cast<label_t>(label);
    }
    return {std::move(points), std::move(labels), bits};
}

/// Bit b(k) of a label as documents count them, k = 0 leftmost.
unsigned bit(unsigned label, unsigned bits, unsigned k)
{
    return label >> (bits - 1 - k) & 1;
}

/// The bits k, k+2, k+4, … of a label as one number, leftmost first.
unsigned every_other(unsigned label, unsigned bits, unsigned k)
{
    unsigned word = 0;
    for (; k < bits; k += 2)
        word = word << 1 | bit(label, bits, k);
    return word;
}

/// Mean energy of a square grid on odd integers: 2(M − 1)/3.
double grid_energy(unsigned bits)
{
    return 2.0 * ((1u << bits) - 1) / 3.0;
}

/*
 * TS 38.211 §5.1.3 to §5.1.7. One axis from its bits c0, c1, …:
 * (1 − 2c0)·[2^(n−1) − (1 − 2c1)·[2^(n−2) − … (1 − 2c(n−1))·1]], and QPSK is (1 − 2c0).
 */
double axis_38211(unsigned word, unsigned n)
{
    double level = 1 - 2.0 * (word & 1);
    for (unsigned k = 1; k < n; ++k)
        level = (1 - 2.0 * (word >> k & 1)) * (static_cast<double>(1u << k) - level);
    return level;
}

signal_set qam_38211(unsigned bits)
{
    const double scale = 1 / std::sqrt(grid_energy(bits));
    return by_label(bits, [=](unsigned label) {
        return scale * complex(axis_38211(every_other(label, bits, 0), bits / 2),
                               axis_38211(every_other(label, bits, 1), bits / 2));
    });
}

/// §5.1.2: ((1 − 2b) + j(1 − 2b))/√2.
signal_set bpsk_38211()
{
    return by_label(1, [](unsigned b) { return std::sqrt(0.5) * complex(1 - 2.0 * b, 1 - 2.0 * b); });
}

/// IEEE 802.11: the first half of the bits gives I, the second Q, each a reflected Gray code counted from the
/// most negative level.
signal_set qam_80211(unsigned bits)
{
    const unsigned half = bits / 2, levels = 1u << half;
    const double scale = 1 / std::sqrt(grid_energy(bits));
    const auto level = [=](unsigned word) { return 2.0 * gray_rank(word) - levels + 1; };
    return by_label(bits, [=](unsigned label) {
        return scale * complex(level(label >> half), level(label & (levels - 1)));
    });
}

signal_set bpsk_80211()
{
    return by_label(1, [](unsigned b) { return complex(2.0 * b - 1, 0); });
}

/// EN 302 755: even bits give I, odd bits Q, each a reflected Gray code counted from the most positive level;
/// unit energy; then turned counter-clockwise by the angle in degrees.
signal_set rotated_302755(unsigned bits, double degrees)
{
    const unsigned half = bits / 2, levels = 1u << half;
    const double scale = 1 / std::sqrt(grid_energy(bits));
    const auto level = [=](unsigned word) { return levels - 1 - 2.0 * gray_rank(word); };
    const complex turn = std::polar(1.0, degrees * std::acos(-1.0) / 180);
    return by_label(bits, [=](unsigned label) {
        return scale * turn * complex(level(every_other(label, bits, 0)), level(every_other(label, bits, 1)));
    });
}

/// A point of EN 302 307-1 figures 9 to 12: ring 1 … 3, angle in 48ths of a turn.
struct ring_place {
    unsigned char ring;
    signed char angle;
};

complex place(const ring_place& p, const std::array<double, 3>& radius)
{
    return radius[p.ring - 1u] * on_unit_circle(static_cast<std::uint64_t>(p.angle + 48), 48);
}

/// Figure 9: QPSK, label 00 at 45°, 10 at 135°, 11 at 225°, 01 at 315°.
signal_set qpsk_302307()
{
    constexpr std::array<signed char, 4> angle{6, -6, 18, -18};
    return by_label(2, [&](unsigned label) { return place({1, angle[label]}, {1, 1, 1}); });
}

/// Figure 10, unit radius.
signal_set psk8_302307()
{
    constexpr std::array<signed char, 8> angle{6, 0, 24, 30, 12, 42, 18, 36};
    return by_label(3, [&](unsigned label) { return place({1, angle[label]}, {1, 1, 1}); });
}

/// Figure 11; gamma = R2/R1 from table 9; R1² + 3·R2² = 4.
signal_set apsk16_302307(double gamma)
{
    constexpr std::array<ring_place, 16> figure{{{2, 6},
                                                 {2, -6},
                                                 {2, 18},
                                                 {2, -18},
                                                 {2, 2},
                                                 {2, -2},
                                                 {2, 22},
                                                 {2, -22},
                                                 {2, 10},
                                                 {2, -10},
                                                 {2, 14},
                                                 {2, -14},
                                                 {1, 6},
                                                 {1, -6},
                                                 {1, 18},
                                                 {1, -18}}};
    const double inner = std::sqrt(4 / (1 + 3 * gamma * gamma));
    return by_label(4, [&](unsigned label) { return place(figure[label], {inner, gamma * inner, 0}); });
}

/// Figure 12; gamma1 = R2/R1, gamma2 = R3/R1 from table 10; R1² + 3·R2² + 4·R3² = 8.
signal_set apsk32_302307(double gamma1, double gamma2)
{
    constexpr std::array<ring_place, 32> figure{
        {{2, 6}, {2, 10}, {2, -6}, {2, -10}, {2, 18}, {2, 14}, {2, -18}, {2, -14},
         {3, 3}, {3, 9},  {3, -6}, {3, -12}, {3, 18}, {3, 12}, {3, -21}, {3, -15},
         {2, 2}, {1, 6},  {2, -2}, {1, -6},  {2, 22}, {1, 18}, {2, -22}, {1, -18},
         {3, 0}, {3, 6},  {3, -3}, {3, -9},  {3, 21}, {3, 15}, {3, 24},  {3, -18}}};
    const double inner = std::sqrt(8 / (1 + 3 * gamma1 * gamma1 + 4 * gamma2 * gamma2));
    return by_label(5, [&](unsigned label) {
        return place(figure[label], {inner, gamma1 * inner, gamma2 * inner});
    });
}

std::vector<standard_set> build()
{
    std::vector<standard_set> all;
    const auto add =
        [&](std::string name, std::string about, std::string clause, std::function<signal_set()> make) {
            all.push_back({{"std:" + name, std::move(about), clause + " (from memory)"}, std::move(make)});
        };

    const std::string nr = "3GPP TS 38.211 §5.1.";
    add("38.211/bpsk",
        "BPSK on the diagonal; π/2-BPSK is this, turned a quarter at every second symbol",
        nr + "2",
        bpsk_38211);
    add("38.211/qpsk", "QPSK, Gray", nr + "3", [] { return qam_38211(2); });
    add("38.211/16qam", "16-QAM, Gray", nr + "4", [] { return qam_38211(4); });
    add("38.211/64qam", "64-QAM, Gray", nr + "5", [] { return qam_38211(6); });
    add("38.211/256qam", "256-QAM, Gray", nr + "6", [] { return qam_38211(8); });
    add("38.211/1024qam", "1024-QAM, Gray", nr + "7", [] { return qam_38211(10); });

    const std::string s2 = "ETSI EN 302 307-1 §5.4.";
    add("302307-1/qpsk", "QPSK, Gray", s2 + "1, figure 9", qpsk_302307);
    add("302307-1/8psk", "8PSK, Gray", s2 + "2, figure 10", psk8_302307);
    struct rate16 {
        const char* name;
        double gamma;
    };
    for (const auto& r :
         {rate16{"2-3", 3.15}, {"3-4", 2.85}, {"4-5", 2.75}, {"5-6", 2.70}, {"8-9", 2.60}, {"9-10", 2.57}}) {
        std::string ratio = std::to_string(r.gamma);
        ratio.resize(4);
        add(std::string("302307-1/16apsk/") + r.name,
            "16APSK 4+12, ratio " + ratio,
            s2 + "3, figure 11 and table 9",
            [g = r.gamma] { return apsk16_302307(g); });
    }
    struct rate32 {
        const char* name;
        double gamma1, gamma2;
    };
    for (const auto& r : {rate32{"3-4", 2.84, 5.27},
                          {"4-5", 2.72, 4.87},
                          {"5-6", 2.64, 4.64},
                          {"8-9", 2.54, 4.33},
                          {"9-10", 2.53, 4.30}}) {
        std::string first = std::to_string(r.gamma1), second = std::to_string(r.gamma2);
        first.resize(4);
        second.resize(4);
        add(std::string("302307-1/32apsk/") + r.name,
            "32APSK 4+12+16, ratios " + first + " and " + second,
            s2 + "4, figure 12 and table 10",
            [g1 = r.gamma1, g2 = r.gamma2] { return apsk32_302307(g1, g2); });
    }

    const std::string t2 = "ETSI EN 302 755 §6.2 and §6.3";
    const double degrees256 = std::atan(1.0 / 16) * 180 / std::acos(-1.0);
    add("302755/rotated-qpsk", "QPSK turned by 29.0°", t2, [] { return rotated_302755(2, 29.0); });
    add("302755/rotated-16qam", "16-QAM turned by 16.8°", t2, [] { return rotated_302755(4, 16.8); });
    add("302755/rotated-64qam", "64-QAM turned by 8.6°", t2, [] { return rotated_302755(6, 8.6); });
    add("302755/rotated-256qam", "256-QAM turned by atan(1/16)", t2, [=] {
        return rotated_302755(8, degrees256);
    });

    const std::string wlan = "IEEE 802.11-2020 §";
    add("802.11/bpsk", "BPSK", wlan + "17.3.5.8", bpsk_80211);
    add("802.11/qpsk", "QPSK, Gray", wlan + "17.3.5.8", [] { return qam_80211(2); });
    add("802.11/16qam", "16-QAM, Gray", wlan + "17.3.5.8", [] { return qam_80211(4); });
    add("802.11/64qam", "64-QAM, Gray", wlan + "17.3.5.8", [] { return qam_80211(6); });
    add("802.11/256qam", "256-QAM, Gray", wlan + "21.3.10.9", [] { return qam_80211(8); });
    add("802.11/1024qam", "1024-QAM, Gray", "IEEE 802.11ax-2021 §27.3.12.9", [] { return qam_80211(10); });
    return all;
}

} // namespace

const std::vector<standard_set>& standard_sets()
{
    static const std::vector<standard_set> all = build();
    return all;
}

} // namespace halfplane::detail
