# SPDX-License-Identifier: GPL-3.0-or-later
"""Decision map: tiles are the cells, coloured where a count departs beyond chance, arrows between facing cells."""

import itertools
import math
import xml.etree.ElementTree as xml

import numpy as np
import pytest
from command import FIRN as FIRN_FILE
from drawn import counted, outside, overlaps, tiles
from gnuradio.halfplane import load_set, predictor, signal_set, views
from gnuradio.halfplane.views import basis, drawing, svg, words
from sample_logs import settings_of


FIRN = load_set(FIRN_FILE)


def test_expected_errors_of_each_point_are_those_of_the_symbols_sent():
    """Points sent unequally often: the expectation follows n_i, which the report does not hold by itself."""
    sent = [1000 * (k + 1) for k in range(12)]
    link = basis.of(settings_of(FIRN))
    numbers, expected = link.errors_by_point(counted(FIRN, 10.0, sent)["total"])
    by_point = predictor(FIRN).rates(10.0)["exact"]["ser_by_point"]
    np.testing.assert_allclose(expected, [n * s for n, s in zip(sent, by_point)], rtol=1e-9)
    assert all(abs(basis.deviation(k, x)) < 4 for k, x in zip(numbers, expected))


def test_deviation_is_standard_normal_for_a_poisson_count():
    draw = np.random.default_rng(3)
    for expected in (5.0, 40.0, 3000.0):
        values = [basis.deviation(k, expected) for k in draw.poisson(expected, 40_000)]
        # 4 standard errors of 40,000 draws are 0.02 and 0.014; the transform itself is off by less than 0.01 and 0.05.
        assert abs(np.mean(values)) < 0.03 and abs(np.std(values) - 1) < 0.065, expected
    assert math.isclose(basis.deviation(400, 300, 4.0), basis.deviation(400, 300) / 2)


def test_chance_colours_any_of_all_once_in_a_hundred():
    """Quantiles of the normal distribution from a table: 0.995 and 0.99995."""
    clear = views.decision_map.__globals__["clear_deviation"]
    assert math.isclose(clear(1), 2.575829, abs_tol=1e-6) and math.isclose(clear(100), 3.890592, abs_tol=1e-6)


def test_map_of_a_link_as_expected_is_plain():
    plain = 0
    for seed in range(30):
        shown = views.decision_map(counted(FIRN, 10.0, [20000] * 12, seed=seed), settings_of(FIRN))
        coloured = [item for item in shown.items if getattr(item, "note", "") and item.role in ("more", "fewer")]
        plain += not coloured
    # Each has a chance of 1 in 100 to show any colour: more than 3 of 30 have one below 1 in 3,000.
    assert plain >= 27


def test_map_colours_and_signs_what_departs():
    names = FIRN.label_strings
    report = counted(FIRN, 10.0, [20000] * 12, lambda i, j: 2.0 if i == 3 else 0.4 if i == 7 else 1.0)
    shown = views.decision_map(report, settings_of(FIRN))
    roles = {tile.note.split(":")[0]: tile.role for tile in tiles(shown)}
    assert {name for name, role in roles.items() if role == "more"} == {names[3]}
    assert {name for name, role in roles.items() if role == "fewer"} == {names[7]}
    marks = {item.note: item.shape for item in shown.items if isinstance(item, drawing.Mark) and item.note}
    assert marks[names[3]] == "plus" and marks[names[7]] == "minus" and marks[names[0]] == "circle"
    places = {item.note: item for item in shown.items if isinstance(item, drawing.Mark) and item.note}
    for one, other in itertools.combinations(range(12), 2):
        way = FIRN.points[other] - FIRN.points[one]
        assert (places[names[other]].x - places[names[one]].x) * way.real >= -1e-9  # to the right
        assert (places[names[other]].y - places[names[one]].y) * way.imag <= 1e-9  # up
    assert names[3] in shown.description and names[7] in shown.description and names[0] not in shown.description
    numbers = [row for row in report["total"]["transitions"] if row[0] == 3]
    tile = next(tile for tile in tiles(shown) if tile.note.startswith(names[3]))
    assert f" {words.count(sum(row[2] for row in numbers))} errors" in tile.note


def test_map_arrows_are_transitions_between_facing_cells():
    report = counted(FIRN, 10.0, [20000] * 12, lambda i, j: 3.0 if (i, j) == (0, 1) else 1.0)
    facing = predictor(FIRN).facing(10.0)
    shown = views.decision_map(report, settings_of(FIRN))
    arrows = {item.note.split(":")[0]: item for item in shown.items if isinstance(item, drawing.Arrow)}
    names = FIRN.label_strings
    expected = {f"{names[i]} decided as {names[j]}" for i, j, *_ in report["total"]["transitions"] if j in facing[i]}
    assert set(arrows) == expected and 1 in facing[0]
    odd, even = arrows[f"{names[0]} decided as {names[1]}"], arrows[f"{names[1]} decided as {names[0]}"]
    assert odd.role == "more" and even.role == "quiet" and 2.4 < odd.width / even.width < 3.6
    # From sent to decided: along the direction of the points, with the vertical axis turned over.
    way = FIRN.points[1] - FIRN.points[0]
    assert (odd.x2 - odd.x1) * way.real - (odd.y2 - odd.y1) * way.imag > 0


def test_map_tiles_are_the_cells():
    """Each tile holds its own point, and the MAP border moves with the gauged N0."""
    pair = signal_set([1.0, -1.0], priors=[0.9, 0.1], name="pair")
    at = {}
    for es_n0_db in (0.0, 10.0):
        shown = views.decision_map(counted(pair, es_n0_db, [9000, 1000]), settings_of(pair, "map"))
        at[es_n0_db] = min(x for x, _ in tiles(shown)[0].points)
    scale = tiles(shown)[0].points
    unit = (max(x for x, _ in scale) - at[10.0]) / (1 + 1.2 - 0.1 * math.log(0.1 / 0.9) / 4)
    # Threshold N0 ln(q/p)/4 with Es = 1: at 0 dB it lies 0.9 · ln 9 / 4 farther left than at 10 dB.
    assert math.isclose(at[10.0] - at[0.0], 0.9 * math.log(9) / 4 * unit, abs_tol=0.05)


@pytest.mark.parametrize("name", ["psk:2", "qam:256", "qam:4096"])
def test_map_of_small_and_large_sets(name):
    large = load_set(name)
    shown = views.decision_map({"total": {}}, settings_of(large), labels=True)
    assert len(tiles(shown)) == large.size
    assert outside(shown) == []
    xml.fromstring(svg.render(shown))
    if large.size > 256:
        assert not set(large.label_strings) & set(shown.texts())
        assert "not counted cell by cell" in " ".join(shown.texts())
    else:
        assert set(large.label_strings) <= set(shown.texts()) or name == "qam:256"
    assert ("too many to be read" in " ".join(shown.texts())) == (large.size >= 256)


def test_labels_are_drawn_where_they_can_be_read():
    """Larger, the same set shows its labels; no letters below six units anywhere; labels keep clear of one another."""
    large = load_set("qam:256")
    for size in ((300.0, 340.0), (480.0, 450.0), (720.0, 770.0), (1400.0, 1400.0)):
        shown = views.decision_map({"total": {}}, settings_of(large), size, labels=True)
        found = [item for item in shown.items if isinstance(item, drawing.Text) and item.text in set(large.label_strings)]
        assert len(found) == (256 if size[0] >= 700 else 0), size
        assert all(item.size >= 6 and item.layer == "labels" for item in found)
        assert ("too many to be read" in " ".join(shown.texts())) == (not found)
        assert overlaps(shown) == [] and outside(shown) == []


def test_map_shows_samples_and_labels_on_demand():
    report, known = counted(FIRN, 10.0, [2000] * 12), settings_of(FIRN)
    plain = views.decision_map(report, known)
    assert not set(FIRN.label_strings) & set(plain.texts())
    samples = [0.1 + 0.2j, 1e6 + 0j, *[0.5j] * 3000]
    full = views.decision_map(report, known, labels=True, cloud=samples)
    assert set(FIRN.label_strings) <= set(full.texts())
    dots = next(item for item in full.items if isinstance(item, drawing.Cloud))
    assert len(dots.points) == 2000 and dots.layer == "samples"
    # A page hides a layer by its class; without the layers the drawing is the plain one.
    assert svg.render(full, "page").count('class="hp-labels"') == 24 and svg.render(full, "page").count('class="hp-samples"') == 1
    bare = [item for item in full.items if not getattr(item, "layer", "")]
    assert bare == plain.items
