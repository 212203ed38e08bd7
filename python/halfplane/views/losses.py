# SPDX-License-Identifier: GPL-3.0-or-later
"""Losses: the shortfall at the input by cause, bars that begin where the one above ends; the unexplained rest hatched."""

from __future__ import annotations

from . import lettering, words
from .axes import LinearAxis
from .drawing import Bar, Drawing, Line, Text

SIZE = (720.0, 280.0)
REST, TOGETHER = ("unexplained", "rest"), "interaction"
_MARGIN, _ROW, _BAR = 14.0, 26.0, 14.0


def parts(report: dict) -> tuple[list[tuple[str, float, str]], float | None]:
    """
    [(cause, dB, note)] by size, then what the causes do together, the rest last; and what they add up to: the shortfall at
    the input. Without it the sum of all, the loss over the noise alone; None where no loss is known.

    With the input the rest is the difference, so that the bars add up to the shortfall that every view shows.
    """
    known = {each["cause"]: each for each in report.get("losses", ()) if "cause" in each and "cost_db" in each}
    found = [(cause, each["cost_db"], _power(each)) for cause, each in known.items() if cause not in (*REST, TOGETHER)]
    found.sort(key=lambda each: -each[1])
    if TOGETHER in known:
        found.append((TOGETHER, known[TOGETHER]["cost_db"], "what the causes cost together beyond the sum of each"))
    total = report.get("shortfall", {}).get("input", {}).get("db")
    if total is not None:
        found.append((REST[0], total - sum(each[1] for each in found), ""))
    elif known:
        found += [(cause, known[cause]["cost_db"], "") for cause in REST if cause in known]
        total = sum(each[1] for each in found)
    return found, total


def _power(each: dict) -> str:
    power = each.get("power_db")
    if power is None:
        return ""
    return f"power {words.db(abs(power), 1)} dB {'below' if power < 0 else 'above'} the signal's"


def whole(report: dict) -> str:
    """What the bars add up to."""
    return "at the input in all" if "db" in report.get("shortfall", {}).get("input", {}) else "over the noise alone"


def losses(report: dict, settings: dict | None = None, size: tuple[float, float] = SIZE) -> Drawing:
    """The width is kept; the drawing is as high as its rows need, whatever height is asked for."""
    out = Drawing("losses", size[0], 40.0, title="Where the decibels go")
    found, total = parts(report)
    if not found:
        out.description = f"Losses {words.UNKNOWN}."
        text = f"Losses {words.UNKNOWN}: they take the Es/N0 at the input and some errors"
        for k, line in enumerate(lettering.wrapped(text, out.width - 2 * _MARGIN, 12)):
            out.add(Text(_MARGIN, 24 + 16 * k, line, "quiet", 12))
            out.height = 34.0 + 16 * k
        return out
    out.description = _description(report, found, total)

    names = [*(words.name(cause) for cause, _, _ in found), whole(report)]
    column = min(0.42 * out.width, max(lettering.width(name, 12, True) for name in names)) + 10
    ends = _ends(found)
    values = [0.0, *(value for pair in ends for value in pair), *_of_interval(report)]
    low, high = min(values), max(values)
    air = 0.03 * max(high - low, 0.05)
    room = lettering.width("+00.00 dB", 11.5)
    axis = LinearAxis(low - air, max(high, low + 0.1) + air, _MARGIN + column, out.width - _MARGIN - room, 6)
    rows = len(found) + (total is not None)
    foot = 12 + rows * _ROW + 4
    out.height = foot + 42
    for value, label in axis.ticks():
        out.add(Line(((axis(value), 8), (axis(value), foot)), "rule"), Text(axis(value), foot + 15, label, "quiet", 11, "middle"))
    out.add(Line(((axis(0), 8), (axis(0), foot)), "ink", 1.2))
    out.add(Text((axis.low_end + axis.high_end) / 2, foot + 32, "loss (dB of Es/N0)", "quiet", 11, "middle"))

    y = 12.0
    for (cause, db, note), (start, end) in zip(found, ends):
        rest = cause in REST
        _draw_row(out, axis, y, column, words.name(cause), start, end, db, rest, note)
        if (cause, db, note) != found[-1]:
            out.add(Line(((axis(end), y + _BAR + 3), (axis(end), y + _ROW + 3)), "quiet", 0.8, "dot"))
        y += _ROW
    if total is not None:
        _draw_total(out, report, axis, y, column, total)
    return out


def _ends(found) -> list[tuple[float, float]]:
    """Where each bar starts and ends."""
    at, ends = 0.0, []
    for _, db, _ in found:
        ends.append((at, at + db))
        at += db
    return ends


def _of_interval(report: dict) -> list[float]:
    at = report.get("shortfall", {}).get("input", {})
    return [at[key] for key in ("db", "db_low", "db_high") if key in at]


def _draw_row(out, axis, y, column, name, start, end, db, rest, note) -> None:
    text = f"{'+' if round(db, 2) >= 0 else ''}{words.db(db)} dB"
    said = f"{name}: {text}" + (f"; {note}" if note else "")
    low, high = sorted((axis(start), axis(end)))
    out.add(Text(_MARGIN, y + 12, lettering.shortened(name, column - 10, 12), "ink", 12, note=said))
    out.add(
        Bar(low, y + 1, max(1.5, high - low), _BAR, "ground" if rest else "loss", "rest" if rest else None, hatch=rest, round=1.5, note=said)
    )
    out.add(Text(out.width - _MARGIN, y + 12, text, "ink", 11.5, "end"))


def _draw_total(out, report, axis, y, column, total) -> None:
    at, name = report.get("shortfall", {}).get("input", {}), whole(report)
    at = at if "db" in at else {"db": total}
    out.add(Line(((_MARGIN, y - 3), (out.width - _MARGIN, y - 3)), "rule"))
    out.add(Text(_MARGIN, y + 12, lettering.shortened(name, column - 10, 12, True), "ink", 12, bold=True))
    low, high = sorted((axis(0.0), axis(total)))
    note = f"{name}: {words.shortfall(at)}"
    out.add(Bar(low, y + 1, max(1.5, high - low), _BAR, "measured_soft", "measured", note=note))
    if "db_low" in at and "db_high" in at:
        middle, (a, b) = y + 1 + _BAR / 2, (axis(at["db_low"]), axis(at["db_high"]))
        out.add(Line(((a, middle), (b, middle)), "measured", 2.0, note=note))
        for end in (a, b):
            out.add(Line(((end, middle - 4), (end, middle + 4)), "measured", 1.6, note=note))
    out.add(Text(out.width - _MARGIN, y + 12, f"{words.db(total)} dB", "ink", 11.5, "end", bold=True))


def _description(report: dict, found, total) -> str:
    listed = ", ".join(f"{words.name(cause)} {words.db(db)} dB" for cause, db, _ in found)
    if whole(report) == "at the input in all":
        return f"The shortfall at the input, {words.shortfall(report['shortfall']['input'])}, is made of: {listed}."
    return f"Loss over the noise alone, {words.db(total)} dB, is made of: {listed}. The Es/N0 at the input is not known."
