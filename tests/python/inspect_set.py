# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane inspect`: schema, facts against SciPy, typed coordinates, and the drawing."""

import cmath
import itertools
import json
import math

import numpy as np
import pytest
from command import FIRN, document, halfplane
from scipy.spatial import Delaunay
from scipy.spatial.distance import pdist

FIELDS = {
    "name": str, "size": int, "label_bits": int, "entropy_bits": float, "es": float, "eb": float, "mean_i": float,
    "mean_q": float, "papr_db": float, "d_min": float, "closest_pairs": int, "mean_closest": float, "facing": list,
    "mean_facing": float, "facing_bit_distance": float, "gray": bool, "gray_among_closest": bool, "distances": list,
    "rotations": int, "mirrors": int,
}  # fmt: skip


def points_of(path):
    return np.array([complex(point["i"], point["q"]) for point in json.load(open(path))["points"]])


def test_schema():
    facts = document("inspect", FIRN)
    assert {field: type(facts[field]) for field in facts} == FIELDS
    assert all(set(each) == {"d", "pairs"} for each in facts["distances"])


def test_energies_and_distances_against_numpy():
    facts, points = document("inspect", FIRN), points_of(FIRN)
    power = abs(points) ** 2
    between = pdist(np.column_stack([points.real, points.imag]))
    assert facts["es"] == pytest.approx(power.mean(), rel=1e-14)
    assert facts["eb"] == pytest.approx(power.mean() / math.log2(12), rel=1e-14)
    assert facts["papr_db"] == pytest.approx(10 * math.log10(power.max() / power.mean()), rel=1e-12)
    assert facts["d_min"] == pytest.approx(between.min(), rel=1e-14)
    assert sum(each["pairs"] for each in facts["distances"]) == 12 * 11
    assert facts["distances"][-1]["d"] == pytest.approx(between.max(), rel=1e-3)


def test_facing_points_are_the_edges_of_the_delaunay_triangulation():
    # hex:19 has no four points on one empty circle, so every edge of the triangulation is a shared edge of two
    # cells, save slivers along the hull, which 19 points in a hexagon do have: those edges join points of one side.
    facts, file = document("inspect", "hex:19"), json.loads(halfplane("sets", "hex:19", "--json").stdout)
    points = np.array([[point["i"], point["q"]] for point in file["points"]])
    edges = {frozenset(pair) for triangle in Delaunay(points).simplices for pair in itertools.combinations(triangle, 2)}
    near = {edge for edge in edges if np.linalg.norm(np.subtract(*points[list(edge)])) < 2.1}
    assert {frozenset((i, j)) for i, row in enumerate(facts["facing"]) for j in row} == near


def test_a_ring_typed_with_four_decimals_is_still_a_ring(tmp_path):
    path = tmp_path / "ring.csv"
    gray = ["000", "001", "011", "010", "110", "111", "101", "100"]
    rows = [f"{label},{z.real:.4f},{z.imag:.4f}" for label, z in zip(gray, (cmath.rect(1, math.pi * k / 4) for k in range(8)))]
    path.write_text("\n".join(["label,i,q", *rows]) + "\n")
    facts = document("inspect", path)
    assert facts["rotations"] == 8 and facts["mirrors"] == 8
    assert facts["gray"] is True and facts["mean_closest"] == 2.0 and facts["mean_facing"] == 2.0
    # Taken at its word, it is none: four decimals leave the sides of the octagon unequal.
    assert document("inspect", path, "--tolerance", "1e-9")["rotations"] < 8


def test_drawing_has_every_label_once():
    text = halfplane("inspect", FIRN).stdout
    drawn = text[text.index("ordered pairs") :]
    for point in json.load(open(FIRN))["points"]:
        assert drawn.count(f" {point['label']}") == 1
    assert halfplane("inspect", "qam:64").stdout.count("●") == 64
