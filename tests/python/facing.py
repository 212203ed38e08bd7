# SPDX-License-Identifier: GPL-3.0-or-later
"""
Facing points against SciPy's Delaunay triangulation (Qhull). Two points whose cells share an edge are joined in the
triangulation, and the edge runs between the centres of the circles around the two triangles at that side; where four
points or more lie on one circle the triangulation is not unique, the centres agree and the edge has no length.
"""

import numpy as np
import pytest
from gnuradio.halfplane import predictor, signal_set
from scipy.spatial import Delaunay

SHORTEST = 1e-7  # of the closest distance: an edge below is a common corner


def circumcentre(a, b, c):
    """The point as far from a as from b and c, by its two linear equations."""
    sides = np.array([b - a, c - a])
    return a + np.linalg.solve(2 * sides, (sides**2).sum(axis=1))


def facing_by_delaunay(points):
    # A wide frame of far points makes every cell of the inner points bounded; it may face them, but not come between.
    angles = 2 * np.pi * (np.arange(40) + 0.37) / 40
    reach = np.abs(points).max()
    frame = 1e4 * reach * np.column_stack([np.cos(angles), np.sin(angles)])
    plane = np.vstack([np.column_stack([points.real, points.imag]), frame])
    mesh = Delaunay(plane, qhull_options="Qbb Qc Qz Q12")
    closest = min(abs(a - b) for k, a in enumerate(points) for b in points[:k])
    centres = [circumcentre(*plane[corners]) for corners in mesh.simplices]
    around = {}
    for triangle, corners in enumerate(mesh.simplices):
        for k in range(3):
            side = tuple(sorted(np.delete(corners, k)))
            around.setdefault(side, []).append(centres[triangle])
    facing = [set() for _ in points]
    for (i, j), found in around.items():
        if j >= len(points) or len(found) != 2:
            continue
        if np.linalg.norm(found[0] - found[1]) > SHORTEST * closest:
            facing[i].add(j)
            facing[j].add(i)
    return [sorted(each) for each in facing]


def as_set(points):
    bits = max(1, int(np.ceil(np.log2(len(points)))))
    return signal_set(points, np.arange(len(points)), bits)


@pytest.mark.parametrize("seed", range(20))
def test_random_sets(seed):
    draw = np.random.default_rng(seed)
    m = [3, 5, 7, 33, 100][seed % 5]
    points = draw.normal(size=m) + 1j * draw.normal(size=m)
    assert predictor(as_set(points)).facing() == facing_by_delaunay(points)


@pytest.mark.parametrize("turn", [0.0, 0.3, 1.1])
@pytest.mark.parametrize("lattice", ["square", "hexagonal", "rectangular"])
def test_lattices_whose_cells_meet_in_corners(lattice, turn):
    second = {"square": 1j, "hexagonal": np.exp(1j * np.pi / 3), "rectangular": 1.7j}[lattice]
    points = np.array([a + b * second for a in range(-3, 4) for b in range(-3, 4)]) * np.exp(1j * turn)
    facing = predictor(as_set(points)).facing()
    assert facing == facing_by_delaunay(points)
    inner = len(points) // 2  # the middle of the lattice: 4 or 6 sides, by hand
    assert len(facing[inner]) == (6 if lattice == "hexagonal" else 4)
