# SPDX-License-Identifier: GPL-3.0-or-later
"""What every view owes: numbers equal the report's, the same bytes twice, sound XML in every theme, labels side by side."""

import itertools
import math
import random
import re
import tracemalloc
import xml.etree.ElementTree as xml

import numpy as np
import pytest
import sample_reports
from command import FIRN as FIRN_FILE
from gnuradio.halfplane import load_set, predictor, signal_set, views
from gnuradio.halfplane.views import axes, basis, drawing, lettering, svg, themes, words

FIRN = load_set(FIRN_FILE)
def settings_of(signal_set, detector="ml"):
    """As watch::settings() writes them."""
    found = {
        "set": signal_set.name, "points": [[p.real, p.imag] for p in signal_set.points], "labels": signal_set.label_strings,
        "pattern": "draw:2026", "law": "awgn", "detector": detector, "decisions": "own", "confidence": 0.95, "window": 10000,
    }  # fmt: skip
    if not signal_set.uniform:
        found["priors"] = list(signal_set.priors)
    return found


SETTINGS = settings_of(FIRN)
REPORTS = {
    "high": sample_reports.step(8.0), "low": sample_reports.step(18.0), "silent": sample_reports.silent(),
    "searching": sample_reports.searching(), "empty": {}, "full": sample_reports.full(),
}  # fmt: skip
SIZES = [(360.0, 260.0), (720.0, 300.0), (1200.0, 420.0)]
RAISED = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")


def number(text):
    """The value of a rate as words.rate writes it."""
    if "·10" in text:
        mantissa, exponent = text.split("·10")
        return float(mantissa) * 10.0 ** int(exponent.translate(RAISED))
    return float(text)


def overlaps(shown):
    """Pairs of texts that lie on one another."""
    return [
        (a[4], b[4])
        for a, b in itertools.combinations(lettering.boxes(shown), 2)
        if a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]
    ]


def outside(shown):
    return [box[4] for box in lettering.boxes(shown) if box[0] < 0 or box[1] < 0 or box[2] > shown.width or box[3] > shown.height]


def test_rates_read_back():
    random.seed(1)
    for _ in range(2000):
        value = 10 ** random.uniform(-300, 0)
        assert math.isclose(number(words.rate(value)), value, rel_tol=5.1e-3), value
    assert words.rate(0.9996) == "1.000" and words.rate(1.23456e-4) == "1.23·10⁻⁴" and words.rate(0) == "0"


@pytest.mark.parametrize("theme", ["light", "dark", "page"])
@pytest.mark.parametrize("name", views.VIEWS)
@pytest.mark.parametrize("report", REPORTS.values(), ids=REPORTS)
def test_svg_is_sound(name, report, theme):
    given = [report] if name in views.OF_SEVERAL else report
    shown = views.VIEWS[name](given, SETTINGS)
    text = svg.render(shown, theme)
    tree = xml.fromstring(text)
    names = {"s": "http://www.w3.org/2000/svg"}
    assert tree.get("role") == "img"
    assert tree.find("s:title", names).text and tree.find("s:desc", names).text
    for reference in tree.get("aria-labelledby").split():
        assert tree.find(f".//*[@id='{reference}']") is not None
    assert "style=" not in text and "<script" not in text and "http" not in text.replace("http://www.w3.org/2000/svg", "")
    assert svg.render(views.VIEWS[name](given, SETTINGS), theme) == text
    if theme == "page":
        assert not re.search(r"#[0-9a-f]{6}", text)


def test_every_role_has_a_colour():
    for theme in themes.THEMES.values():
        assert set(theme) == set(drawing.ROLES)
    sheet = themes.stylesheet()
    assert all(sheet.count(themes.variable(role) + ":") == 4 for role in drawing.ROLES)


def luminance(colour):
    """Relative luminance of sRGB, WCAG 2.1."""
    channels = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one, other):
    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("theme", themes.THEMES)
def test_text_stands_out(theme):
    """WCAG 2.1, 1.4.3: 4.5 for text; 1.4.11: 3 for what is drawn."""
    colours = themes.THEMES[theme]
    for role in ("ink", "quiet", "measured", "exact", "facing", "nearest", "target", "more", "fewer", "good", "bad", "open"):
        assert contrast(colours[role], colours["ground"]) >= 4.5, role
    for role in ("union", "slip", "overflow", "lost", "loss", "rest"):
        assert contrast(colours[role], colours["ground"]) >= 3, role


def test_arrow_ends_at_its_tip():
    outline = drawing.Arrow(0, 0, 30, 40, width=4).outline()
    assert any(math.isclose(x, 30) and math.isclose(y, 40) for x, y in outline)
    assert drawing.Arrow(1, 1, 1, 1).outline() == ()


def test_a_coordinate_that_is_no_number_is_refused():
    with pytest.raises(ValueError, match="nan"):
        svg.render(drawing.Drawing("x", 10, 10, items=[drawing.Mark(math.nan, 1)]))


def test_spread_moves_least():
    """Against the best of a fine search for three labels; far labels stay where they are."""
    assert lettering.spread([10, 200, 400], [20, 20, 20], 0, 500) == [10, 200, 400]
    wishes, gap = [50.0, 52.0, 58.0], 8.0
    placed = lettering.spread(wishes, [20, 20, 20], 0, 500, gap)
    cost = sum((a - b) ** 2 for a, b in zip(placed, wishes))
    best = min(
        sum((a - b) ** 2 for a, b in zip((x, x + 28 + d, x + 56 + d + e), wishes))
        for x in [k / 10 for k in range(100, 600)] for d in (0, 1, 2) for e in (0, 1, 2)
    )  # fmt: skip
    assert cost <= best + 1e-9
    packed = lettering.spread([490, 492, 499], [20, 20, 20], 0, 500, gap)
    assert packed[2] + 10 <= 500 and all(b - a >= 28 - 1e-9 for a, b in zip(packed, packed[1:]))


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("name", views.VIEWS)
@pytest.mark.parametrize("report", REPORTS.values(), ids=REPORTS)
@pytest.mark.parametrize("known", [SETTINGS, None], ids=["set", "no set"])
def test_texts_stand_apart_within_the_frame(report, name, size, known):
    shown = views.VIEWS[name]([report] if name in views.OF_SEVERAL else report, known, size)
    assert shown.width == size[0]
    assert overlaps(shown) == [] and outside(shown) == []


def test_ladder_labels_stand_apart_wherever_the_rungs_are():
    random.seed(2)
    for _ in range(300):
        report = sample_reports.step(random.uniform(0, 20))
        spread = 10 ** random.uniform(-4, 0.5)
        for figures in report["total"]["predicted"].values():
            for kind in figures:
                figures[kind] *= math.exp(random.uniform(-spread, spread))
        report["verdict"] = {"target": {"ser": report["total"]["ser"] * math.exp(random.uniform(-spread, spread))}}
        shown = views.ladder(report, None, random.choice(SIZES))
        assert overlaps(shown) == [] and outside(shown) == []


def test_ladder_shows_the_reports_numbers():
    report = sample_reports.step(12.0)
    total = report["total"]
    texts = views.ladder(report, None, (1200, 420)).texts()
    for kind in ("ser", "ber"):
        assert words.rate(total[kind]) in texts
        assert f"95 %: {words.rate(total[kind + '_low'])} to {words.rate(total[kind + '_high'])}" in texts
        for figures in total["predicted"].values():
            assert words.rate(figures[kind]) in texts


def test_ladder_places_are_logarithms():
    """Every rung and the estimate stand where log10 of their rate says, to a hundredth."""
    report = sample_reports.step(12.0)
    total = report["total"]
    shown = views.ladder(report, None)
    lines = [item for item in shown.items if isinstance(item, drawing.Line) and item.points[0][0] == item.points[1][0]]
    at = {item.role: item.points[0][0] for item in lines if item.role in ("measured", *words.RUNGS)}  # the last row: BER
    values = {"measured": total["ber"], **{name: total["predicted"][name]["ber"] for name in words.RUNGS}}
    scale = (at["union"] - at["nearest"]) / math.log10(values["union"] / values["nearest"])
    for role, value in values.items():
        assert math.isclose(at[role] - at["nearest"], scale * math.log10(value / values["nearest"]), abs_tol=0.01), role


def test_ladder_says_on_which_side():
    report = sample_reports.step(14.0)
    total = report["total"]
    for ratio, sign in ((1.5, "▲"), (1.0, "="), (0.5, "▼")):
        exact = total["predicted"]["exact"]["ser"]
        total.update(ser=ratio * exact, ser_low=0.8 * ratio * exact, ser_high=1.2 * ratio * exact)
        said = [text for text in views.ladder(report, None).texts() if text[:1] in "▲=▼"]
        assert said[0].startswith(sign), (ratio, said)


def counted(signal_set, es_n0_db, sent, factor=lambda i, j: 1.0, seed=1, detector="automatic"):
    """A report whose transitions are drawn from Poisson counts, `factor` times their expectation."""
    exact = predictor(signal_set, "awgn", detector)
    chances, draw = exact.transitions(es_n0_db), np.random.default_rng(seed)
    rows = []
    for i, j in itertools.permutations(range(signal_set.size), 2):
        expected = sent[i] * chances[i, j]
        if number := int(draw.poisson(expected * factor(i, j))):
            rows.append([i, j, number, expected])
    symbols = int(sum(sent))
    total = {
        "symbols": symbols, "judged": symbols, "symbol_errors": sum(row[2] for row in rows), "es_n0_db": es_n0_db, "transitions": rows,
        "predicted": {"exact": {"ser": float(sum(n * s for n, s in zip(sent, exact.rates(es_n0_db)["exact"]["ser_by_point"])) / symbols)}},
    }  # fmt: skip
    return {"total": total, "lock": {"state": "held"}}


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


def tiles(shown):
    return [item for item in shown.items if isinstance(item, drawing.Polygon)]


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


def test_map_shows_samples_and_labels_on_demand():
    report, known = counted(FIRN, 10.0, [2000] * 12), settings_of(FIRN)
    plain = views.decision_map(report, known)
    assert not set(FIRN.label_strings) & set(plain.texts())
    samples = [0.1 + 0.2j, 1e6 + 0j, *[0.5j] * 3000]
    full = views.decision_map(report, known, labels=True, cloud=samples)
    assert set(FIRN.label_strings) <= set(full.texts())
    dots = next(item for item in full.items if isinstance(item, drawing.Cloud))
    assert len(dots.points) == 2000


def test_heading_answers_three_questions():
    def said(report):
        return [(each.state, each.answer) for each in views.answers(report)]

    report = sample_reports.full()
    assert said(report) == [("good", "Locked"), ("open", "0.25 dB short at the input"), ("open", "Undecided: SER below 10⁻³")]
    report["verdict"]["state"] = "pass"
    report["lock"]["state"] = "lost"
    report["shortfall"]["decision"] = {"db": 1.5, "db_low": 1.2, "db_high": 1.8}
    assert said(report) == [("bad", "Lock lost"), ("bad", "1.50 dB short at the decision"), ("good", "Passes: SER below 10⁻³")]
    report["shortfall"]["decision"] = {"db": -0.5, "db_low": -0.6, "db_high": -0.4}
    assert said(report)[1] == ("open", "0.50 dB better than Gaussian noise")
    assert [state for state, _ in said({})] == ["quiet"] * 3
    assert "0.20 % left out" in views.answers(sample_reports.full())[2].detail
    assert said(sample_reports.silent())[2] == ("open", "SER below 3.00·10⁻⁴, 95 % sure")
    told = views.heading(report).description
    assert all(each.answer in told and each.detail in told for each in views.answers(report))


def test_share_of_all_but_a_few_is_not_all():
    assert words.percent(0.99999) == "99.99 %" and words.percent(1.0) == "100 %" and words.percent(0.0022) == "0.22 %"


def bars(shown, role):
    return [item for item in shown.items if isinstance(item, drawing.Bar) and item.role == role and item.note]


def test_losses_add_up_to_the_shortfall_at_the_input():
    report = sample_reports.full()
    found, total = views.losses.__globals__["parts"](report)
    assert math.isclose(sum(db for _, db, _ in found), report["shortfall"]["input"]["db"], abs_tol=1e-12) and total == 0.25
    shown = views.losses(report)
    lengths = {bar.note.split(":")[0]: bar.width for bar in [*bars(shown, "loss"), *bars(shown, "ground"), *bars(shown, "measured_soft")]}
    unit = lengths["at the input in all"] / 0.25
    for each in report["losses"]:
        assert math.isclose(lengths[words.name(each["cause"])], unit * abs(each["cost_db"]), abs_tol=0.02), each
        assert f"{each['cost_db']:+.2f} dB".replace("-", "−") in shown.texts()
    hatched = [item.note.split(":")[0] for item in shown.items if getattr(item, "hatch", False)]
    assert hatched == ["not explained"]
    # Each bar begins where the one above it ends: echo, phase noise, I/Q imbalance to the right, then back, then the rest.
    row = [bar for bar in shown.items if isinstance(bar, drawing.Bar) and bar.role in ("loss", "ground")]
    ends = [row[0].x + row[0].width, row[1].x + row[1].width, row[2].x + row[2].width, row[3].x]
    starts = [row[1].x, row[2].x, row[3].x + row[3].width, row[4].x]
    assert len(row) == 5 and all(math.isclose(a, b, abs_tol=0.01) for a, b in zip(ends, starts))


def test_losses_without_the_input_add_up_over_the_noise():
    report = sample_reports.full()
    del report["shortfall"]["input"]
    shown = views.losses(report)
    assert "over the noise alone" in shown.texts() and "0.25 dB" in shown.texts() and "not known" in shown.description
    report["losses"] = []
    assert "Losses not known yet" in views.losses(report).description


def test_rest_is_what_the_shortfall_leaves():
    """Whatever a report's own rest says: the sum is the shortfall shown elsewhere."""
    report = sample_reports.full()
    report["losses"] = report["losses"][:2]
    assert "+0.11 dB" in views.losses(report).texts()


def test_left_out_counts_from_lock_on():
    report = sample_reports.full()
    assert words.left_out(report) == 0.002
    del report["verdict"]
    out = 500 + 1000 + 20_000 + 3
    assert math.isclose(words.left_out(report), out / (out + report["total"]["judged"]))
    assert words.left_out(sample_reports.step(12.0)) == 0.0


def test_account_adds_up_and_says_everything():
    report = sample_reports.full()
    total = report["total"]
    shown = views.account(report)
    assert sum(number for _, number, _ in views.account.__globals__["rows"](report)) == total["in"]
    texts = shown.texts()
    for number in (total["in"], total["judged"], total["pending"], total["nonfinite"], *total["excluded"].values()):
        assert words.count(number) in texts
    assert "fails by 0.12 dB" in texts and "too few symbols to tell" in texts
    assert "Undecided: SER below 10⁻³, about 1.2 million symbols to go" in texts
    assert {"400", "12", "0.0300 (0.0156 to 0.0518)", "25"} <= set(texts)
    assert any("no target was given" in text for text in views.account(sample_reports.step(12.0)).texts())


def live_run(number, slips_at=(), lost=(0, 0)):
    """Reports of a run as they come, counters only growing."""
    excluded, slips = {"before_lock": 904, "slip": 0, "signal_lost": 0, "overflow": 0}, 0
    for k in range(number):
        gone = lost[0] <= k < lost[1]
        if k in slips_at:
            slips, excluded["slip"] = slips + 1, excluded["slip"] + 500
        if gone:
            excluded["signal_lost"] += 1000
        yield {
            "sequence": k, "lock": {"state": "lost" if gone else "held"},
            "total": {"in": 10_000 * (k + 1), "seconds": float(k + 1), "excluded": dict(excluded), "slips": slips},
            "shortfall": {"input": {"db": 0.3 + 0.001 * (k % 7), "db_low": 0.2, "db_high": 0.4}},
        }  # fmt: skip


def test_trace_keeps_memory_flat_and_every_event():
    trace = views.Trace(most=300)
    after = []
    tracemalloc.start()
    for k, report in enumerate(live_run(10_000, slips_at=range(0, 10_000, 97), lost=(4000, 4100))):
        trace.add(report)
        if k in (1000, 9999):
            after.append(tracemalloc.get_traced_memory()[0])
    tracemalloc.stop()
    assert len(trace.spans) <= 300 and trace.reports == 10_000
    assert after[1] < 1.2 * after[0]
    slips = len(range(0, 10_000, 97))
    assert sum(span.slips for span in trace.spans) == slips
    events = {cause: sum(span.events.get(cause, 0) for span in trace.spans) for cause in ("before_lock", "slip", "signal_lost")}
    assert events == {"before_lock": 904, "slip": 500 * slips, "signal_lost": 100_000}
    spans = trace.spans
    assert spans[0].start == 0 and spans[-1].end == 10_000 and all(a.end == b.start for a, b in zip(spans, spans[1:]))
    gaps = [span for span in spans if span.lock == "lost"]
    assert gaps[0].start <= 4000 and gaps[-1].end >= 4100 and gaps[-1].end - gaps[0].start < 400
    # The latest part is as it came.
    assert spans[-1].end - spans[-1].start == 1 and spans[-1].falls["input"] == (0.3 + 0.001 * (9999 % 7), 0.2, 0.4)


def test_history_of_many_reports_is_small():
    text = svg.render(views.history(views.Trace(live_run(10_000, slips_at=range(0, 10_000, 97)))))
    assert len(text) < 120_000


def test_history_shows_gaps_events_and_the_latest_shortfall():
    shown = views.history(list(live_run(100, slips_at=(70,), lost=(40, 50))), None, (1200, 420))
    gaps = [item for item in shown.items if isinstance(item, drawing.Bar) and item.note == "not locked"]
    assert len(gaps) == 1
    ticks = [line.points[0][0] for line in shown.items if isinstance(line, drawing.Line) and line.role == "quiet" and line.points[0][0] == line.points[1][0]]
    seconds = (max(ticks) - min(ticks)) / 100
    assert math.isclose(gaps[0].x, min(ticks) + 40 * seconds, abs_tol=0.1) and math.isclose(gaps[0].width, 10 * seconds, abs_tol=0.1)
    slip = next(item for item in shown.items if isinstance(item, drawing.Mark) and item.shape == "diamond" and "left out" in item.note)
    assert math.isclose(slip.x, min(ticks) + 70.5 * seconds, abs_tol=0.1)
    assert "slip: 500 symbols in 1" in shown.texts() and "signal lost: 10 000 symbols" in shown.texts()
    assert "Latest shortfall at the input: 0.30 dB (0.20 to 0.40 dB)" in shown.description


def test_history_of_several_runs_has_a_line_between():
    runs = [*live_run(20), *live_run(20)]
    shown = views.history(runs)
    assert sum(getattr(item, "note", "") == "another run begins" for item in shown.items) == 1
    assert len(views.Trace(runs).spans) == 40 and views.Trace(runs).spans[-1].end == 40


def test_curve_points_and_curves_are_the_numbers():
    reports = [sample_reports.step(es_n0_db) for es_n0_db in (8.0, 12.0, 16.0)]
    shown = views.curve(reports, SETTINGS, kind="ber")
    exact = next(item for item in shown.items if isinstance(item, drawing.Line) and item.role == "exact")
    marks = [item for item in shown.items if isinstance(item, drawing.Mark) and item.shape == "circle" and item.note]
    assert len(marks) == 3
    for mark, report in zip(marks, reports):
        total = report["total"]
        assert mark.note.startswith(f"{words.rate(total['ber'])} ({words.rate(total['ber_low'])} to {words.rate(total['ber_high'])})")
    # Both axes from two marks; then every vertex of the curve must be the predictor's rate.
    t1, t2 = reports[0]["total"], reports[2]["total"]
    across = (marks[2].x - marks[0].x) / (t2["es_n0_db"] - t1["es_n0_db"])
    up = (marks[2].y - marks[0].y) / math.log10(t2["ber"] / t1["ber"])
    for x, y in exact.points[:-1]:
        es_n0_db = t1["es_n0_db"] + (x - marks[0].x) / across
        ber = t1["ber"] * 10 ** ((y - marks[0].y) / up)
        assert math.isclose(ber, float(predictor(FIRN).ber(es_n0_db)), rel_tol=1e-6)


def test_curve_without_errors_points_down():
    shown = views.curve([sample_reports.silent()], SETTINGS)
    assert [item.shape for item in shown.items if isinstance(item, drawing.Mark) and item.note] == ["down", "down"]
    assert "below 3.00·10⁻⁴" in shown.description


def test_lines_are_cut_at_the_frame():
    pieces = axes.clipped([(0, -10), (10, 10), (20, 30), (30, 5)], 0, 20)
    assert pieces == [((5, 0), (10, 10), (15, 20)), ((24, 20), (30, 5))]
