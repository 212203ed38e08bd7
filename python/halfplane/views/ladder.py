# SPDX-License-Identifier: GPL-3.0-or-later
"""Ladder: the measured rate with its interval among the four rungs, on one logarithmic axis; SER above BER."""

from __future__ import annotations


from . import lettering, words
from .axes import LogAxis
from .drawing import Bar, Drawing, Line, Mark, Text

SIZE = (720.0, 300.0)
_MARGIN = 14.0
_BAR = 12.0


def ladder(report: dict, settings: dict | None = None, size: tuple[float, float] = SIZE, part: str = "total") -> Drawing:
    """
    part: "total" for the run, "window" for the latest window. settings is taken for the sake of one signature; the ladder
    needs none. At least 300 × 230; the two rows share the height.
    """
    width, height = size
    counted = report.get(part, {})
    rows = [row for row in (_Row(report, counted, kind) for kind in ("ser", "ber"))]
    out = Drawing("ladder", width, height, title="Measured and predicted error rates")
    out.description = " ".join(row.sentence() for row in rows)
    values = [value for row in rows for value in row.values()]
    if not values:
        out.add(Text(_MARGIN, 24, "No symbol judged yet", "quiet", 13))
        return out

    axis = LogAxis(values, _MARGIN + 8, width - _MARGIN - 8)
    foot = height - 38
    each = foot / len(rows)
    for at, _ in axis.ticks():
        out.add(Line(((axis(at), 26), (axis(at), foot)), "rule"))
    for k, row in enumerate(rows):
        _draw_row(out, row, axis, k * each, each)
    out.add(Line(((axis.low_end, foot), (axis.high_end, foot)), "quiet"))
    axis.draw_labels(out, foot + 15)
    out.add(Text(width / 2, height - 6, "error rate (errors per symbol, errors per bit)", "quiet", 11, "middle"))
    return out


class _Row:
    """What one row shows: of SER or of BER."""

    def __init__(self, report: dict, counted: dict, kind: str):
        self.kind = kind
        self.measured = counted.get(kind)
        self.low, self.high = counted.get(kind + "_low"), counted.get(kind + "_high")
        # Of live traffic the rungs alone: nothing can be counted there.
        self.live = self.measured is None and "live_part" in counted
        predicted = (counted["live_part"] if self.live else counted).get("predicted", {})
        self.rungs = {name: predicted[name][kind] for name in words.RUNGS if predicted.get(name, {}).get(kind, 0) > 0}
        self.target = report.get("verdict", {}).get("target", {}).get(kind)
        self.errors = counted.get({"ser": "symbol_errors", "ber": "bit_errors"}[kind], 0)
        self.confidence = report.get("confidence", 0.95)

    def values(self) -> list[float]:
        known = [self.measured, self.low, self.high, self.target, *self.rungs.values()]
        return [value for value in known if value is not None and value > 0]

    def sentence(self) -> str:
        """The row for whoever cannot see it."""
        name = words.KINDS[self.kind].capitalize()
        if self.measured is None and not (self.live and self.rungs):
            return f"{name} {words.UNKNOWN}."
        if self.live:
            text = f"{name} not counted"
        else:
            text = f"{name} {words.rate(self.measured)}, {100 * self.confidence:g} % interval {words.interval(self.low, self.high)}"
        if self.rungs:
            text += "; predicted: " + ", ".join(f"{name} {words.rate(value)}" for name, value in self.rungs.items())
        return text + "."


def _draw_row(out: Drawing, row: _Row, axis: LogAxis, top: float, height: float) -> None:
    head, line = top + 16, top + height - 26
    out.add(Text(_MARGIN, head, row.kind.upper(), "ink", 13, bold=True))
    if row.measured is None and not (row.live and row.rungs):
        out.add(Text(_MARGIN + 44, head, words.UNKNOWN, "quiet", 12))
        return
    if row.live:
        out.add(Text(_MARGIN + 44, head, "predicted of live traffic; nothing is counted", "quiet", 12))
    else:
        _draw_head(out, row, head)
    out.add(Line(((axis.low_end, line), (axis.high_end, line)), "rule", 1.5))
    _draw_rungs(out, row, axis, head + 18, line)
    _draw_measured(out, row, axis, line)


def _draw_head(out: Drawing, row: _Row, y: float) -> None:
    """The figures in words; what has no room is left out, the last first."""
    right = out.width - _MARGIN
    x = _MARGIN + 44
    value = words.rate(row.measured) if row.measured > 0 else "no error"
    pieces = [(value, "measured", True), (f"{100 * row.confidence:g} %: {words.interval(row.low, row.high)}", "quiet", False)]
    if "exact" in row.rungs:
        role, text = words.against(row.measured, row.low, row.high, row.rungs["exact"])
        sign = {"more": "▲ ", "fewer": "▼ ", "even": "= "}[role]
        verdict = sign + text
        needed = lettering.width(verdict, 12, True)
        if x + lettering.width(value, 13, True) + 12 + needed <= right:
            out.add(Text(right, y, verdict, "ink" if role == "even" else role, 12, "end", bold=True))
            right -= needed + 14
    for text, role, bold in pieces:
        needed = lettering.width(text, 13 if bold else 12, bold)
        if x + needed > right:
            break
        out.add(Text(x, y, text, role, 13 if bold else 12, bold=bold))
        x += needed + 12


_RUNG_LINE = {"exact": (3.0, "solid"), "facing": (1.6, "dash"), "union": (1.6, "dashdot"), "nearest": (1.8, "dot")}


def _draw_rungs(out: Drawing, row: _Row, axis: LogAxis, top: float, line: float) -> None:
    """A stroke at each rung, its label above, fanned out where rungs lie close, a leader from one to the other."""
    marks = [(value, words.rung(name, row.kind), words.rate(value), name) for name, value in row.rungs.items()]
    if row.target:
        marks.append((row.target, "target", words.rate(row.target), "target"))
    marks.sort(key=lambda mark: mark[0])
    sizes = [max(lettering.width(name, 11, True), lettering.width(value, 10.5)) for _, name, value, _ in marks]
    tall = line - top > 52 and _MARGIN * 2 + sum(sizes) + 8 * len(sizes) <= out.width
    if not tall:
        sizes = [lettering.width(name, 11, True) for _, name, _, _ in marks]
    centres = lettering.spread([axis(mark[0]) for mark in marks], sizes, _MARGIN, out.width - _MARGIN)
    label, foot = top, top + (17 if tall else 5)
    for (value, name, figure, role), centre in zip(marks, centres):
        at, (stroke, dash) = axis(value), _RUNG_LINE.get(role, (2.0, "solid"))
        note = f"{name} {figure}"
        out.add(Text(centre, label, name, role, 11, "middle", bold=True, note=note))
        if tall:
            out.add(Text(centre, label + 13, figure, "ink", 10.5, "middle"))
        out.add(Line(((centre, foot), (at, line - 20)), role, 0.9))
        out.add(Line(((at, line - 20), (at, line)), role, stroke, dash, note=note))
        if role == "target":
            out.add(Mark(at, line - 3, "down", role, 8, note=note))
        elif name.startswith("≤"):
            out.add(Mark(at - 4, line - 20, "left", role, 6, note=f"{name}: the rate lies at or below"))


def _draw_measured(out: Drawing, row: _Row, axis: LogAxis, line: float) -> None:
    """Below the line that the rungs stand on: a bar over the interval, a tick at the estimate; open to the left without errors."""
    if row.measured is None or not row.high or row.high <= 0:
        return
    note = f"measured {words.rate(row.measured)}, interval {words.interval(row.low, row.high)}"
    high = axis(row.high)
    low = axis(row.low) if row.low and row.low > 0 else axis.low_end
    # An interval narrower than a stroke is still there.
    middle, least, top = (low + high) / 2, 2.0, line + 4
    low, high = min(low, middle - least / 2), max(high, middle + least / 2)
    out.add(Bar(low, top, high - low, _BAR, "measured_soft", "measured", 1.0, 0.75, round=2, note=note))
    if not row.low:
        out.add(Mark(axis.low_end - 3, top + _BAR / 2, "left", "measured", 10, note="no error yet: only an upper end is known"))
    if row.measured > 0:
        at = axis(row.measured)
        out.add(Line(((at, line), (at, top + _BAR + 3)), "measured", 3.0, note=note))

