# SPDX-License-Identifier: GPL-3.0-or-later
"""Curve: measured points with their intervals over the four predicted curves."""

from __future__ import annotations

import math

from . import basis, legend, words
from .axes import LinearAxis, LogAxis, clipped
from .drawing import Drawing, Line, Mark, Text

SIZE = (560.0, 420.0)
_LEFT, _RIGHT, _TOP = 56.0, 14.0, 26.0
# In the order of drawing: where they coincide the exact curve lies on top.
LOOKS = {"union": (1.4, "dashdot"), "facing": (1.5, "dash"), "nearest": (1.9, "dot"), "exact": (2.8, "solid")}


def points(reports, kind: str) -> list[tuple[float, float | None, dict]]:
    """(Es/N0 as gauged, Es/N0 at the input or None, totals) of the reports that say enough for a point."""
    found = []
    for report in reports:
        total = report.get("total", {})
        if "es_n0_db" in total and total.get(kind + "_high", 0) > 0:
            found.append((total["es_n0_db"], report.get("input", {}).get("es_n0_db"), total))
    return found


def curve(reports, settings: dict | None, size: tuple[float, float] = SIZE, kind: str = "ser") -> Drawing:
    """reports: one a point, each the latest of its run. kind: "ser" or "ber"."""
    name = words.KINDS[kind]
    out = Drawing("curve", *size, title=f"{name.capitalize()} against Es/N0")
    link = basis.of(settings)
    if link is None:
        out.description = "The set is not known yet, so its curves are not either."
        out.add(Text(14, 24, "The set is not known yet", "quiet", 13))
        return out
    measured = points(reports, kind)
    at = [value for gauged, given, _ in measured for value in (gauged, given) if value is not None]
    low, high = (min(at), max(at)) if at else _usual(link)
    air = max(1.5, 0.12 * (high - low))
    # Whole decibels: the live view then draws the same curve again and again.
    low, high = math.floor(low - air), math.ceil(high + air)
    rates = link.curve(low, high)
    entries, room = _legend(kind, measured), out.width - 28
    bottom = out.height - 40 - legend.height(entries, room)
    x = LinearAxis(low, high, _LEFT, out.width - _RIGHT, max(3, int(out.width / 80)))
    y = LogAxis(_rates_shown(measured, rates, kind), bottom, _TOP, least_decades=2.0, air=0.02)
    _draw_axes(out, x, y, name, bottom)
    for rung, (width, dash) in LOOKS.items():
        line = [(x(es_n0_db), y.at_log(ln / math.log(10))) for es_n0_db, ln in zip(rates["es_n0_db"], rates[rung]["ln_" + kind])]
        for piece in clipped(line, _TOP, bottom):
            out.add(Line(piece, rung, width, dash, note=words.rung(rung, kind)))
    for gauged, given, total in measured:
        for place, es_n0_db in (("input", given), ("decision", gauged)):
            if es_n0_db is not None:
                _draw_point(out, x(es_n0_db), y, bottom, total, kind, place, es_n0_db)
    legend.draw(out, entries, 14, bottom + 34, room)
    out.description = _description(measured, kind, name)
    return out


def _usual(link) -> tuple[float, float]:
    """Where the rate goes from a tenth to a millionth."""
    return float(link.predictor.es_n0_db_for_ser(0.1)), float(link.predictor.es_n0_db_for_ser(1e-6))


def _rates_shown(measured, rates, kind: str) -> list[float]:
    """Measured rates with their intervals and half a decade below; above as far as the exact curve goes."""
    shown = [min(1.0, math.exp(max(rates["exact"]["ln_" + kind])))]
    if not measured:
        return [*shown, math.exp(max(min(rates["exact"]["ln_" + kind]), -27.6))]
    for _, _, total in measured:
        values = [total[key] for key in (kind, kind + "_low", kind + "_high") if total.get(key, 0) > 0]
        shown += [*values, min(values) / 3, min(1.0, max(values))]
    return shown


def _draw_axes(out: Drawing, x, y, name: str, bottom: float) -> None:
    for value, label in x.ticks():
        out.add(Line(((x(value), _TOP), (x(value), bottom)), "rule"), Text(min(x(value), out.width - 10), bottom + 15, label, "quiet", 11, "middle"))
    last = math.inf
    for value, label in y.ticks():
        out.add(Line(((_LEFT, y(value)), (out.width - _RIGHT, y(value))), "rule"))
        if last - y(value) >= 13:
            out.add(Text(_LEFT - 6, y(value) + 4, label, "quiet", 11, "end"))
            last = y(value)
    out.add(Line(((_LEFT, bottom), (out.width - _RIGHT, bottom)), "quiet"), Line(((_LEFT, _TOP), (_LEFT, bottom)), "quiet"))
    out.add(Text(14, 16, name, "quiet", 11))
    out.add(Text(out.width - _RIGHT, bottom + 29, "Es/N0 (dB)", "quiet", 11, "end"))


def _draw_point(out: Drawing, x: float, y, bottom: float, total: dict, kind: str, place: str, es_n0_db: float) -> None:
    """A point with its interval; an arrow down from the upper end where no error was counted."""
    where = "as gauged" if place == "decision" else "at the input"
    note = f"{words.rate(total[kind])} ({words.interval(total.get(kind + '_low'), total[kind + '_high'])}), Es/N0 {where} {words.db(es_n0_db)} dB"
    role = "measured"

    def at(value):
        return min(max(y(value), _TOP), bottom)

    top = at(total[kind + "_high"])
    if total.get(kind + "_low", 0) > 0:
        low = at(total[kind + "_low"])
        out.add(Line(((x, top), (x, low)), role, 1.4, note=note))
        for end in (top, low):
            out.add(Line(((x - 3.5, end), (x + 3.5, end)), role, 1.4))
        out.add(Mark(x, at(total[kind]), "circle" if place == "decision" else "ring", role, 7, note=note))
    else:
        out.add(Line(((x - 5, top), (x + 5, top)), role, 1.8, note=note), Line(((x, top), (x, min(bottom, top + 16))), role, 1.4))
        out.add(Mark(x, min(bottom, top + 18), "down", role, 8, note=note))


def _legend(kind: str, measured) -> list[legend.Entry]:
    entries = [legend.Entry("line", rung, words.rung(rung, kind), *LOOKS[rung]) for rung in words.RUNGS]
    if measured:
        entries.append(legend.Entry("circle", "measured", "counted, Es/N0 as gauged"))
    if any(given is not None for _, given, _ in measured):
        entries.append(legend.Entry("ring", "measured", "counted, Es/N0 at the input"))
    return entries


def _description(measured, kind: str, name: str) -> str:
    if not measured:
        return f"Predicted {name}; nothing was counted yet."
    said = [f"at {words.db(gauged)} dB {words.rate(total[kind])}, {words.interval(total.get(kind + '_low'), total[kind + '_high'])}" for gauged, _, total in measured]
    return f"Counted {name}, Es/N0 as gauged: " + "; ".join(said) + "."
