# SPDX-License-Identifier: GPL-3.0-or-later
"""What every view owes: numbers equal the report's, the same bytes twice, sound XML in every theme, labels side by side."""

import math
import random
import re
import xml.etree.ElementTree as xml

import pytest
import sample_reports
from command import FIRN as FIRN_FILE
from drawn import number, outside, overlaps
from gnuradio.halfplane import load_set, views
from gnuradio.halfplane.views.account import rows as account_rows
from gnuradio.halfplane.views import drawing, lettering, svg, themes, words
from sample_logs import settings_of


FIRN = load_set(FIRN_FILE)
SETTINGS = settings_of(FIRN)
REPORTS = {
    "high": sample_reports.step(8.0), "low": sample_reports.step(18.0), "silent": sample_reports.silent(),
    "searching": sample_reports.searching(), "empty": {}, "full": sample_reports.full(),
    "live": sample_reports.live(), "partly": sample_reports.partly(),
}  # fmt: skip
SIZES = [(360.0, 260.0), (720.0, 300.0), (1200.0, 420.0)]


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


@pytest.mark.parametrize("name", ["live", "partly", "full"])
def test_account_adds_up_with_every_kind_of_symbol(name):
    report = REPORTS[name]
    assert sum(number for _, number, _ in account_rows(report)) == report["total"]["in"]


def test_live_traffic_is_never_shown_as_counted():
    report = REPORTS["live"]
    locked, good, sure = views.answers(report)
    assert (locked.answer, good.answer, sure.answer) == ("No pattern to lock to", "Nothing to hold it against", "Nothing is counted")
    assert "14.48 ± 0.029 dB" in good.detail and words.rate(7.1e-3) in sure.detail
    ladder = views.ladder(report)
    assert ladder.texts().count("predicted of live traffic; nothing is counted") == 2
    assert not [item for item in ladder.items if isinstance(item, drawing.Bar)]  # no measured bar
    assert words.rate(7.1e-3) in ladder.texts() and "not counted" in ladder.description
    account = views.account(report)
    assert "live, gauged blindly" in account.texts() and "cannot be counted" in account.texts()
    assert "15\u202f904" in account.texts()


def test_what_was_known_by_decoding_stands_apart():
    report = REPORTS["partly"]
    account = views.account(report)
    assert {"known by decoding alone", "Known by decoding alone", "3 of 50\u202f279", "are missing here: it flatters"} <= set(account.texts())
    # The ladder shows what was known in advance, and nothing of the others.
    assert words.rate(report["total"]["ser"]) in views.ladder(report).texts()
    assert words.rate(3 / 50_279) not in views.ladder(report).texts()


def test_greyscale_loses_nothing():
    """What two colours tell apart, something else tells too: a sign, a shape, a stroke, a hatch or a word."""
    report = REPORTS["full"]
    # The four rungs: no two strokes are alike.
    strokes = {item.role: (item.width, item.dash) for item in views.ladder(report).items if isinstance(item, drawing.Line) and item.note and item.role in words.RUNGS}
    assert len(strokes) == len(set(strokes.values())) == 4
    # Tiles with more and with fewer errors than expected: plus and minus at their points, a circle where neither.
    crowded = {**report, "total": {**report["total"], "es_n0_db": 12.0, "transitions": [[0, 1, 900, 100.0], [1, 0, 10, 100.0], [2, 3, 100, 100.0]]}}
    shown = views.decision_map(crowded, SETTINGS)
    signs = {item.shape for item in shown.items if isinstance(item, drawing.Mark)}
    roles = {item.role for item in shown.items if isinstance(item, drawing.Polygon)}
    assert {"more", "fewer"} <= roles and {"plus", "minus"} <= signs
    calm = views.decision_map({}, SETTINGS)
    assert {item.shape for item in calm.items if isinstance(item, drawing.Mark)} == {"circle"}
    # Good, bad and open: three shapes, in the heading and in the account.
    for states in ({"good": "held", "bad": "lost", "open": "doubtful"},):
        found = {role: next(item.shape for item in views.heading({"lock": {"state": state}}).items if isinstance(item, drawing.Mark)) for role, state in states.items()}
        assert len(set(found.values())) == 3
    # What no cause explains is hatched, the causes are not; each row has its name.
    bars = [item for item in views.losses(report, SETTINGS).items if isinstance(item, drawing.Bar) and item.role == "loss" or isinstance(item, drawing.Bar) and item.edge == "rest"]
    assert any(item.hatch for item in bars) and not all(item.hatch for item in bars)
