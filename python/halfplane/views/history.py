# SPDX-License-Identifier: GPL-3.0-or-later
"""History: the shortfall with its interval over time; where lock was missing; what was left out, by cause."""

from __future__ import annotations

from . import legend, lettering, words
from .axes import LinearAxis
from .drawing import Bar, Drawing, Line, Mark, Polygon, Text
from .trace import Trace

SIZE = (720.0, 260.0)
# By place: role of line and band, dash, how the band is told from the other.
_PLACES = {"input": ("measured", "measured_soft", "solid", 0.55), "decision": ("loss", "loss", "dash", 0.22)}
_EVENTS = {"slip": ("slip", "diamond"), "overflow": ("overflow", "square"), "signal_lost": ("lost", "down"), "before_lock": ("before", "up")}
_LEFT, _RIGHT, _TOP, _LANE = 52.0, 14.0, 26.0, 18.0


def history(reports, settings: dict | None = None, size: tuple[float, float] = SIZE) -> Drawing:
    """reports: a Trace (kept and fed by whoever shows a link live), or reports in their order."""
    trace = reports if isinstance(reports, Trace) else Trace(reports)
    out = Drawing("history", *size, title="Shortfall over time")
    if not trace.spans:
        out.description = "No report yet."
        out.add(Text(14, 24, "No report yet", "quiet", 13))
        return out
    spans = trace.spans
    shown = [place for place in _PLACES if any(place in span.falls for span in spans)]
    entries, room = _legend(spans, shown), out.width - 28
    lane = out.height - 40 - legend.height(entries, room)
    floor = lane - _LANE
    end = max(spans[-1].end, spans[0].start + 1e-9)
    divisor, unit = _unit(end) if trace.in_seconds else (1.0, "symbols taken in")
    if not trace.in_seconds and end >= 1e6:
        divisor, unit = 1e6, "million symbols taken in"
    x = LinearAxis(0.0, end / divisor, _LEFT, out.width - _RIGHT, max(2, int(out.width / 110)))
    y = LinearAxis(*_range(spans), floor, _TOP, max(2, int((floor - _TOP) / 34)))

    def across(value: float) -> float:
        return x(value / divisor)

    _draw_gaps(out, spans, across, lane)
    for value, label in y.ticks():
        out.add(Line(((_LEFT, y(value)), (out.width - _RIGHT, y(value))), "rule"), Text(_LEFT - 6, y(value) + 4, label, "quiet", 11, "end"))
    for value, label in x.ticks():
        middle = min(x(value), out.width - 2 - lettering.width(label, 11) / 2)
        out.add(Line(((x(value), lane), (x(value), lane + 4)), "quiet"), Text(middle, lane + 16, label, "quiet", 11, "middle"))
    out.add(Line(((_LEFT, lane), (out.width - _RIGHT, lane)), "quiet"), Line(((_LEFT, y(0)), (out.width - _RIGHT, y(0))), "ink", 1.2))
    out.add(Text(_LEFT - 38, 14, "shortfall (dB); 0: what the constellation permits", "quiet", 11))
    out.add(Text(out.width - _RIGHT, lane + 29, unit, "quiet", 11, "end"))
    for first, second in zip(spans, spans[1:]):
        if second.run != first.run:
            out.add(Line(((across(second.start), _TOP), (across(second.start), lane)), "quiet", 1.0, "dot", note="another run begins"))
    for place in shown:
        _draw_fall(out, spans, place, across, y)
    _draw_events(out, spans, across, floor + _LANE / 2)
    legend.draw(out, entries, 14, lane + 34, room)
    out.description = _description(spans, shown, trace)
    return out


def _unit(seconds: float) -> tuple[float, str]:
    for divisor, unit in ((86400.0, "days"), (3600.0, "hours"), (60.0, "minutes")):
        if seconds >= 3 * divisor:
            return divisor, unit
    return 1.0, "seconds"


def _range(spans) -> tuple[float, float]:
    """Zero, every estimate of the later nine tenths, and the intervals of the later half: a start that is wide open may run out of the frame."""
    values = [0.0]
    for k, span in enumerate(spans):
        for db, low, high in span.falls.values():
            if 10 * k >= len(spans) or len(spans) < 10:
                values.append(db)
            if 2 * k >= len(spans):
                values += [value for value in (low, high) if value is not None]
    low, high = min(values), max(values)
    air = 0.08 * max(high - low, 0.2)
    return low - air, max(high, low + 0.2) + air


def _draw_gaps(out: Drawing, spans, across, lane: float) -> None:
    """Shades what was not locked; neighbouring gaps as one."""
    open_from = last = None
    for span in [*spans, None]:
        gap = span is not None and span.lock not in (None, "held")
        if gap and open_from is None:
            open_from = span.start
        if not gap and open_from is not None:
            x1, x2 = across(open_from), across(last)
            out.add(Bar(x1, _TOP, max(1.5, x2 - x1), lane - _TOP, "gap", None, strength=0.75, note="not locked"))
            open_from = None
        last = span.end if span is not None else last


def _draw_fall(out: Drawing, spans, place: str, across, y) -> None:
    role, soft, dash, strength = _PLACES[place]
    for run in _runs(spans, place):
        def within(db):
            return min(max(y(db), y.high_end), y.low_end)

        upper = [(across(span.end), within(span.falls[place][2])) for span in run if None not in span.falls[place]]
        lower = [(across(span.end), within(span.falls[place][1])) for span in run if None not in span.falls[place]]
        if len(upper) > 1:
            out.add(Polygon((*upper, *reversed(lower)), soft, None, strength=strength, note=f"interval at the {place}"))
        points = tuple((across(span.end), within(span.falls[place][0])) for span in run)
        if len(points) > 1:
            out.add(Line(points, role, 2.0, dash, note=f"shortfall at the {place}"))
        at, (db, low, high) = across(run[-1].end), run[-1].falls[place]
        note = f"at the {place}: {db:.2f} dB".replace("-", "−")
        if low is not None and high is not None:
            out.add(Line(((at, within(low)), (at, within(high))), role, 1.6, note=note))
        out.add(Mark(at, within(db), "circle" if place == "input" else "ring", role, 7, note=note))


def _runs(spans, place: str):
    """Stretches of one run in which the shortfall at a place is known."""
    found: list = []
    for span in spans:
        if place not in span.falls:
            continue
        if found and found[-1][-1].run == span.run:
            found[-1].append(span)
        else:
            found.append([span])
    return found


def _draw_events(out: Drawing, spans, across, y: float) -> None:
    """One mark a cause and span in the lane below; marks that would lie on one another become one."""
    last: dict[str, float] = {}
    for span in spans:
        causes = dict(span.events)
        if span.slips and "slip" not in causes:
            causes["slip"] = 0
        for cause, number in causes.items():
            role, shape = _EVENTS.get(cause, ("lost", "down"))
            at = across((span.start + span.end) / 2)
            if at - last.get(cause, -99.0) < 7:
                continue
            last[cause] = at
            out.add(Mark(at, y, shape, role, 8, note=f"{words.CAUSES.get(cause, words.name(cause))}: {words.count(number)} symbols left out"))


def _totals(spans) -> dict[str, int]:
    found: dict[str, int] = {}
    for span in spans:
        for cause, number in span.events.items():
            found[cause] = found.get(cause, 0) + number
    return found


def _legend(spans, shown) -> list[legend.Entry]:
    """Lines and marks that occur, in words."""
    entries = [legend.Entry("line", _PLACES[place][0], f"at the {place}", dash=_PLACES[place][2]) for place in shown]
    if any(span.lock not in (None, "held") for span in spans):
        entries.append(legend.Entry("swatch", "gap", "not locked", strength=0.75))
    slips = sum(span.slips for span in spans)
    for cause, number in _totals(spans).items():
        role, shape = _EVENTS.get(cause, ("lost", "down"))
        text = f"{words.CAUSES.get(cause, words.name(cause))}: {words.count(number)} symbols"
        entries.append(legend.Entry(shape, role, text + (f" in {words.count(slips)}" if cause == "slip" and slips else "")))
    return entries


def _description(spans, shown, trace: Trace) -> str:
    text = f"{words.count(trace.reports)} report{'s' if trace.reports != 1 else ''}."
    for place in shown:
        db, low, high = next(span.falls[place] for span in reversed(spans) if place in span.falls)
        known = {key: value for key, value in (("db", db), ("db_low", low), ("db_high", high)) if value is not None}
        text += f" Latest shortfall at the {place}: {words.shortfall(known)}."
    for cause, number in _totals(spans).items():
        text += f" Left out, {words.CAUSES.get(cause, words.name(cause))}: {words.count(number)} symbols."
    return text
