# SPDX-License-Identifier: GPL-3.0-or-later
"""Account: where every symbol went, what the predictions take for granted and whether it holds, and the verdict."""

from __future__ import annotations

from . import lettering, words
from .drawing import Bar, Drawing, Line, Mark, Text

SIZE = (720.0, 300.0)
_MARGIN, _ROW = 14.0, 20.0
_MARKS = {"good": "circle", "bad": "cross", "quiet": "ring", "open": "ring"}
CAUSE_ROLES = {"before_lock": "before", "slip": "slip", "signal_lost": "lost", "overflow": "overflow"}


def rows(report: dict) -> list[tuple[str, int, str]]:
    """(what, symbols, role): parts of the account that add up to the symbols taken in."""
    total = report.get("total", {})
    found = [("judged", total.get("judged", 0), "exact")]
    # Shown where there are any: most links know all that was sent.
    found += [(what, total[key], role) for what, key, role in (("known by decoding alone", "decoded", "facing"), ("live, gauged blindly", "live", "nearest")) if total.get(key)]
    found += [(words.CAUSES.get(cause, words.name(cause)), number, CAUSE_ROLES.get(cause, "lost")) for cause, number in total.get("excluded", {}).items()]
    return [*found, ("not finite", total.get("nonfinite", 0), "bad"), ("pending", total.get("pending", 0), "rest")]


def account(report: dict, settings: dict | None = None, size: tuple[float, float] = SIZE) -> Drawing:
    """The width is kept; the drawing is as high as its rows need, whatever height is asked for."""
    width = size[0]
    out = Drawing("account", width, 40.0, title="Account of all symbols, premises, verdict")
    if "total" not in report:
        out.description = "Nothing is known yet."
        out.add(Text(_MARGIN, 24, "No report yet", "quiet", 13))
        return out
    wide = width >= 600
    column = (width - 3 * _MARGIN) / 2 if wide else width - 2 * _MARGIN
    left_end = _draw_account(out, report, _MARGIN, 8, column)
    x, y = (2 * _MARGIN + column, 8) if wide else (_MARGIN, left_end + 14)
    right_end = _draw_premises(out, report, x, y, column)
    for title, lines in words.unjudged(report["total"]):
        right_end = _draw_lines(out, title, lines, x, right_end + 8, column)
    right_end = _draw_frames(out, report, x, right_end + 8, column)
    right_end = _draw_seconds(out, report, x, right_end + 8, column)
    end = _draw_verdict(out, report, max(left_end, right_end) + 12)
    out.height = end
    out.description = _description(report)
    return out


def _head(out: Drawing, x: float, y: float, room: float, text: str) -> float:
    out.add(Text(x, y + 14, text, "ink", 13, bold=True), Line(((x, y + 21), (x + room, y + 21)), "rule"))
    return y + 24


def _draw_account(out: Drawing, report: dict, x: float, y: float, room: float) -> float:
    total = report["total"]
    y = _head(out, x, y, room, "Where every symbol went")
    taken, parts = total.get("in", 0), rows(report)
    # The bar gives each part that has symbols at least two units, so that a handful still shows.
    y += 8
    if taken:
        shown = [(number, role, what) for what, number, role in parts if number]
        least = 2.0
        spare = room - least * len(shown)
        at = x
        for number, role, what in shown:
            length = least + spare * number / taken
            out.add(Bar(at, y, length, 12, role, note=f"{what}: {words.count(number)}"))
            at += length
    y += 12
    for what, number, role in [*parts, ("taken in", taken, "")]:
        y += _ROW
        if role:
            out.add(Bar(x, y - 10, 10, 10, role if number else None, "rule" if not number else None, round=2))
        else:
            out.add(Line(((x, y - 14), (x + room, y - 14)), "rule"))
        ink = "ink" if number or not role else "quiet"
        out.add(Text(x + 17, y, what, ink, 12, bold=not role))
        share = words.percent(number / taken) if taken and role and number else ""
        out.add(Text(x + room - 92, y, words.count(number), ink, 12, "end", bold=not role))
        out.add(Text(x + room, y, share, "quiet", 11.5, "end"))
    return y + 6


def _draw_premises(out: Drawing, report: dict, x: float, y: float, room: float) -> float:
    y = _head(out, x, y, room, "What the predictions take for granted")
    premises = report.get("premises")
    if not premises:
        out.add(Text(x, y + _ROW, f"Premises {words.UNKNOWN}", "quiet", 12))
        return y + _ROW + 6
    for each in premises:
        y += _ROW
        role = words.PREMISE_STATES.get(each.get("state"), ("quiet", ""))[0]
        said = words.premise(each)
        note = f"p = {each['p']:.2g}" if "p" in each else ""
        out.add(Mark(x + 5, y - 4, _MARKS[role], role, 8, note=note or said))
        needed = lettering.width(said, 11.5, role == "bad")
        out.add(Text(x + room, y, said, "ink" if role == "bad" else "quiet", 11.5, "end", bold=role == "bad", note=note))
        out.add(Text(x + 17, y, lettering.shortened(words.name(each.get("name", "")), room - 27 - needed, 12), "ink", 12, note=note))
    return y + 6


def _draw_frames(out: Drawing, report: dict, x: float, y: float, room: float) -> float:
    total = report["total"]
    if "frames" not in total:
        return y - 8
    lines = [("judged", words.count(total["frames"])), ("in error", words.count(total.get("frame_errors", 0)))]
    if "fer" in total:
        lines.append(("frame error rate", f"{words.rate(total['fer'])} ({words.interval(total.get('fer_low'), total.get('fer_high'))})"))
    if left_out := sum(total.get("frames_excluded", {}).values()):
        lines.append(("left out", words.count(left_out)))
    return _draw_lines(out, "Frames", lines, x, y, room)


def _draw_lines(out: Drawing, title: str, lines: list[tuple[str, str]], x: float, y: float, room: float) -> float:
    y = _head(out, x, y, room, title)
    for what, said in lines:
        y += _ROW
        out.add(Text(x + 17, y, lettering.shortened(what, room - 27 - lettering.width(said), 12), "ink", 12), Text(x + room, y, said, "ink", 12, "end"))
    return y + 6


def _draw_seconds(out: Drawing, report: dict, x: float, y: float, room: float) -> float:
    seconds = report.get("seconds")
    if not seconds:
        return y - 8
    kinds = ("errored", "severely_errored", "unavailable", "available")
    return _draw_lines(out, "Seconds", [(words.name(key), words.count(seconds[key]) + " s") for key in kinds if key in seconds], x, y, room)


def _draw_verdict(out: Drawing, report: dict, y: float) -> float:
    found, room = report.get("verdict", {}), out.width - 2 * _MARGIN
    role = {"pass": "good", "fail": "bad", "undecided": "open"}.get(found.get("state"), "quiet")
    text = words.verdict(found) if found else f"Verdict {words.UNKNOWN}: no target was given"
    if found.get("state") == "undecided":
        text += f", about {words.about(found['symbols_to_go'])} symbols to go" if "symbols_to_go" in found else ", too near to say how long"
    lines = lettering.wrapped(text, room - 44, 13, True)
    height = 16 + 18 * len(lines)
    out.add(Bar(_MARGIN, y, room, height, "raised", None, round=4), Bar(_MARGIN, y, 4, height, role))
    out.add(Mark(_MARGIN + 20, y + 17, _MARKS[role], role, 9))
    for k, line in enumerate(lines):
        out.add(Text(_MARGIN + 34, y + 21.5 + 18 * k, line, "ink", 13, bold=True))
    return y + height + 10


def _description(report: dict) -> str:
    total = report["total"]
    parts = ", ".join(f"{words.count(number)} {what}" for what, number, _ in rows(report) if number)
    text = f"Of {words.count(total.get('in', 0))} symbols taken in: {parts or 'none yet'}."
    failing = [f"{words.name(each.get('name', ''))} {words.premise(each)}" for each in report.get("premises", ()) if each.get("state") == "fails"]
    for title, lines in words.unjudged(total):
        text += f" {title}: " + ", ".join(f"{what} {said}" for what, said in lines) + "."
    if "premises" in report:
        text += " Premises: " + (", ".join(failing) if failing else "none fails") + "."
    if "verdict" in report:
        text += f" {words.verdict(report['verdict'])}."
    return text
