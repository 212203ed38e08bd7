# SPDX-License-Identifier: GPL-3.0-or-later
"""The terminal view: plain lines without a terminal, and a screen that fits and says what the report says."""

import io

import pytest
import sample_reports
from gnuradio.halfplane import live
from rich.console import Console


def printed(renderable, width):
    console = Console(file=io.StringIO(), width=width, force_terminal=False, highlight=False)
    console.print(renderable)
    return console.file.getvalue()


def screen(width, report, done=()):
    view = live.LinkView("Firn line · firn-12", 6, stream=io.StringIO())
    view.console = Console(file=io.StringIO(), width=width)
    for each in done:
        view.start(each["input"]["es_n0_db"], 1000)
        view.finish(each)
    view.start(report.get("input", {}).get("es_n0_db", 3.0), 10**6)
    view.update(report)
    return printed(view.screen(), width)


def test_without_a_terminal_each_step_gives_two_plain_lines():
    out = io.StringIO()
    with live.LinkView("Firn line", 2, stream=out) as view:
        for number, report in enumerate((sample_reports.step(10.0), sample_reports.silent())):
            view.start(report["input"]["es_n0_db"], 20000)
            view.update({})
            view.update(report)
            view.finish(report)
    lines = out.getvalue().splitlines()
    assert "\x1b" not in out.getvalue()
    assert len(lines) == 5 and lines[0] == "Firn line"
    assert lines[1] == "step 1 of 2: 10.00 dB at the input, 20000 symbols"
    assert "shortfall at the input 0.25 ± 0.08 dB" in lines[2] and "errors 400" in lines[2]
    assert "errors 0" in lines[4] and "shortfall" not in lines[4]


@pytest.mark.parametrize("width", [80, 100, 110, 200])
@pytest.mark.parametrize(
    "report", [sample_reports.step(8.0), sample_reports.step(18.0), sample_reports.silent(), sample_reports.searching(), {}]
)
def test_screen_fits_the_width(width, report):
    text = screen(width, report, done=[sample_reports.step(8.0), sample_reports.silent(), sample_reports.searching()])
    assert max(map(len, text.splitlines())) <= width
    assert "…" not in text.replace(" … ", "")  # nothing was cut off


def test_screen_says_what_the_report_says():
    report = sample_reports.step(12.0)
    text = screen(110, report)
    total = report["total"]
    for words in (
        f"{total['ser']:.2e}", f"{total['ber']:.2e}", f"{total['ser_low']:.2e} … {total['ser_high']:.2e}",
        f"{total['predicted']['union']['ber']:.2e}", "symbol errors 400", "left out 904",
        "shortfall at the decision  0.01 ± 0.06 dB", "11.75 ± 0.01 dB", "held, delay 1234 symbols, rotation 90°",
    ):  # fmt: skip
        assert words in text, words


def test_strip_orders_marks_by_rate():
    report = sample_reports.step(12.0)
    letters, ser = (line.plain for line in list(live.strip(report["total"], 80))[:2])
    # nearest < exact < facing < union in this report, and the count lies above the exact rate
    assert letters.index("n") < letters.index("x") <= letters.index("f") < letters.index("u")
    assert ser.index("●") > letters.index("x")
    assert ser.count("●") == 1 and ser.index("━") < ser.index("●") < ser.rindex("━")


def test_table_leaves_unknown_things_out():
    text = printed(live.steps_table([sample_reports.searching()]), 110)
    assert text.splitlines()[2].split() == ["3.00", "–", "0", "0", "–", "–", "–", "–", "–", "–"]
