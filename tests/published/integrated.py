# SPDX-License-Identifier: GPL-3.0-or-later
"""Error rates of irregular sets by integrating the noise density over the plane, with NumPy and SciPy.

    python3 integrated.py > integrated.json

The plane is integrated in Cartesian coordinates: on each vertical line the interval in which a point wins follows
from comparing it with every other point, its mass from scipy.special.ndtr; across the lines Gauss-Legendre
panels run between the corners of the decision regions, which are found by testing every triple of points. No angle,
no edge and no cell of the library under test appears. Panels are refined until the sums agree to 1e-13.

The facing pairs of nearest-point decisions are taken from scipy.spatial.Voronoi: ridges longer than 1e-9 of the
shortest distance. The rungs then are sums of scipy.special.ndtr over pairs.
"""

import itertools
import json

import numpy as np
from scipy.spatial import Voronoi
from scipy.special import ndtr

NODES, WEIGHTS = np.polynomial.legendre.leggauss(24)


class Region:
    """Decisions for the smallest (y - s)' G (y - s) - w."""

    def __init__(self, points, weights, g):
        self.s = np.column_stack([points.real, points.imag])
        self.w = weights
        self.g = g

    def corners(self):
        """Horizontal positions of all places where three points are equally good and none is better."""
        s, g = self.s, self.g
        constant = np.einsum("ia,ab,ib->i", s, g, s) - self.w
        found = []
        for i, j, k in itertools.combinations(range(len(s)), 3):
            a = 2 * (s[[j, k]] - s[i]) @ g
            b = constant[[j, k]] - constant[i]
            if abs(np.linalg.det(a)) < 1e-12:
                continue
            y = np.linalg.solve(a, b)
            value = constant - 2 * s @ g @ y
            if value[i] <= value.min() + 1e-9:
                found.append(y[0])
        return sorted(found)

    def steep(self, mean, deviation, rest):
        """Places around borders so steep that a column crosses from one side to the other within a small step."""
        s, g = self.s, self.g
        constant = np.einsum("ia,ab,ib->i", s, g, s) - self.w
        places = []
        for j, k in itertools.combinations(range(len(s)), 2):
            across, along = -2 * (s[k] - s[j]) @ g
            width = abs(along) * rest
            if width < 0.5 * abs(across) * deviation:
                at = -(constant[k] - constant[j] + along * mean.imag) / across
                places += [at + width / abs(across) * n for n in range(-12, 13)]
        return places

    def intervals(self, x):
        """For each column x and each point the lowest and highest q at which it wins (empty: low >= high)."""
        s, g = self.s, self.g
        # f_j(x, q) less what all share: -2 (g_iq x + g_qq q) s_q - 2 (g_ii x + g_iq q) s_i + s'Gs - w
        slope = -2 * (g[1, 1] * s[:, 1] + g[0, 1] * s[:, 0])
        start = (np.einsum("ia,ab,ib->i", s, g, s) - self.w)[:, None] - 2 * np.outer(
            g[0, 0] * s[:, 0] + g[0, 1] * s[:, 1], x)
        low = np.full((len(s), len(x)), -np.inf)
        high = np.full((len(s), len(x)), np.inf)
        for j in range(len(s)):
            for k in range(len(s)):
                if k == j:
                    continue
                ds, d0 = slope[k] - slope[j], start[k] - start[j]  # j wins where d0 + ds*q > 0
                if abs(ds) < 1e-14:
                    high[j] = np.where(d0 < 0, -np.inf, high[j])
                elif ds > 0:
                    low[j] = np.maximum(low[j], -d0 / ds)
                else:
                    high[j] = np.minimum(high[j], -d0 / ds)
        return low, high


def mass(low, high):
    """Standard normal mass of [low, high], to full relative accuracy in either tail."""
    flip = low > 0
    a = np.where(flip, -high, low)
    b = np.where(flip, -low, high)
    return np.where(high > low, ndtr(b) - ndtr(a), 0.0)


def transition_row(region, corners, mean, cov):
    """P(j | mean) for all j."""
    deviation = np.sqrt(cov[0, 0])
    rest = np.sqrt(cov[1, 1] - cov[0, 1] ** 2 / cov[0, 0])
    ends = np.array([mean.real - 13 * deviation, mean.real + 13 * deviation])
    inner = [c for c in corners + region.steep(mean, deviation, rest) if ends[0] < c < ends[1]]
    before = None
    for step in (1.0, 0.5, 0.25, 0.125):
        grid = np.arange(ends[0], ends[1], step * deviation)
        places = np.unique(np.concatenate([grid, inner, ends]))
        width = np.diff(places)
        x = (places[:-1, None] + width[:, None] * (NODES + 1) / 2).ravel()
        weight = (width[:, None] * WEIGHTS / 2).ravel()
        density = np.exp(-((x - mean.real) ** 2) / (2 * cov[0, 0])) / (deviation * np.sqrt(2 * np.pi))
        low, high = region.intervals(x)
        centre = mean.imag + cov[0, 1] / cov[0, 0] * (x - mean.real)
        row = (mass((low - centre) / rest, (high - centre) / rest) * density * weight).sum(axis=1)
        if before is not None and np.all(np.abs(row - before) <= 1e-13 * row + 1e-30):
            return row
        before = row
    assert np.all(np.abs(row - before) <= 1e-11 * row + 1e-30), (row, before)
    return row


def bits_apart(a, b):
    return bin(int(a) ^ int(b)).count("1")


def facing_pairs(points):
    shortest = min(abs(a - b) for a, b in itertools.combinations(points, 2))
    v = Voronoi(np.column_stack([points.real, points.imag]))
    pairs = []
    for (i, j), ridge in zip(v.ridge_points, v.ridge_vertices):
        if -1 in ridge or np.linalg.norm(v.vertices[ridge[0]] - v.vertices[ridge[1]]) > 1e-9 * shortest:
            pairs.append((int(i), int(j)))
    return pairs


def case(name, points, labels, bits, db, priors=None, detector="ml", means=None, shape=None, metric="matched"):
    m = len(points)
    p = np.full(m, 1 / m) if priors is None else np.asarray(priors)
    n0 = float(np.sum(p * np.abs(points) ** 2)) / 10 ** (db / 10)
    c = np.eye(2) / 2 if shape is None else np.array([[shape[0], shape[1]], [shape[1], shape[2]]]) / (
        shape[0] + shape[2])
    g = np.linalg.inv(2 * c) if metric == "matched" else np.eye(2)
    weights = n0 * np.log(p) if detector == "map" else np.zeros(m)
    region = Region(points, weights, g)
    corners = region.corners()
    at = points if means is None else means
    rows = np.array([transition_row(region, corners, at[i], n0 * c) for i in range(m)])
    ser_by_point = [float(sum(rows[i, j] for j in range(m) if j != i)) for i in range(m)]
    by_bit = [float(sum(p[i] * rows[i, j] for i in range(m) for j in range(m)
                        if (int(labels[i]) ^ int(labels[j])) >> (bits - 1 - k) & 1)) for k in range(bits)]
    out = {"name": name, "i": [float(z.real) for z in points], "q": [float(z.imag) for z in points],
           "labels": [int(x) for x in labels], "label_bits": bits, "es_n0_db": db, "detector": detector,
           "ser": float(np.dot(p, ser_by_point)), "ber": float(np.mean(by_bit)), "ser_by_point": ser_by_point,
           "ber_by_bit": by_bit, "row_0": [float(x) for x in rows[0]]}
    if priors is not None:
        out["priors"] = [float(x) for x in p]
    if means is not None:
        out["mean_i"], out["mean_q"] = [float(z.real) for z in means], [float(z.imag) for z in means]
    if shape is not None:
        out["shape"], out["metric"] = list(shape), metric
    if means is None and shape is None:
        def rung(pairs):
            ser = ber = 0.0
            for i, j in pairs:
                d = abs(points[i] - points[j])
                pep = ndtr(-(d * d + weights[i] - weights[j]) / (d * np.sqrt(2 * n0)))
                ser += p[i] * pep
                ber += p[i] * pep * bits_apart(labels[i], labels[j]) / bits
            return {"ser": float(ser), "ber": float(ber)}
        out["union"] = rung(itertools.permutations(range(m), 2))
        if detector == "ml":
            pairs = facing_pairs(points)
            out["facing"] = rung(pairs + [(j, i) for i, j in pairs])
            out["facing_pairs"] = sorted([min(a), max(a)] for a in pairs)
    return out


def firn_12():
    return np.concatenate([np.exp(1j * np.deg2rad(45 + 90 * np.arange(4))),
                           2.3 * np.exp(1j * np.deg2rad(22.5 + 45 * np.arange(8)))])


def hexagonal(count):
    grid = [complex(a + b / 2, b * np.sqrt(3) / 2) for a in range(-4, 5) for b in range(-4, 5)]
    return np.array(sorted(grid, key=lambda z: (round(abs(z), 9), np.angle(z)))[:count])


def main():
    draw = np.random.default_rng(1908)
    sets = [("firn-12", firn_12(), np.arange(12), 4), ("hexagonal 19", hexagonal(19), draw.permutation(32)[:19], 5)]
    for m in (5, 7, 33):
        bits = int(np.ceil(np.log2(m)))
        for k in range(2):
            points = draw.normal(size=m) + 1j * draw.normal(size=m)
            sets.append((f"random {m} #{k}", points, draw.permutation(2**bits)[:m], bits))
    out = []
    for name, points, labels, bits in sets:
        for db in (0, 8, 16, 22):
            out.append(case(name, points, labels, bits, db))
        m = len(points)
        if m > 20:
            continue
        priors = draw.dirichlet(np.full(m, 1.0))
        for db in (-6, 3, 12, 20):
            out.append(case(name + " map", points, labels, bits, db, priors, "map"))
        out.append(case(name + " unequal, nearest", points, labels, bits, 9, priors, "ml"))
        means = points * np.exp(0.2j) * 0.9 + (0.07 - 0.04j) + 0.05 * np.conj(points)
        for db in (4, 16):
            out.append(case(name + " displaced", points, labels, bits, db, means=means))
            out.append(case(name + " displaced map", points, labels, bits, db, priors, "map", means=means))
            for metric in ("matched", "nearest"):
                out.append(case(f"{name} shaped {metric}", points, labels, bits, db, shape=(1.0, 0.4, 0.6),
                                metric=metric))
            out.append(case(f"{name} shaped nearest map", points, labels, bits, db, priors, "map", means=means,
                            shape=(1.0, -0.3, 2.0), metric="nearest"))
    print("[\n" + ",\n".join(json.dumps(c) for c in out) + "\n]")


if __name__ == "__main__":
    main()
