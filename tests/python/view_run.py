# SPDX-License-Identifier: GPL-3.0-or-later
"""Losses add up, the account too; history in flat memory with every event; curves are the rates."""

import math
import tracemalloc

import sample_reports
from command import FIRN as FIRN_FILE
from drawn import bars
from gnuradio.halfplane import load_set, predictor, views
from gnuradio.halfplane.views import axes, drawing, svg, words
from sample_logs import settings_of


FIRN = load_set(FIRN_FILE)
SETTINGS = settings_of(FIRN)


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
