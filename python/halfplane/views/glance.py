# SPDX-License-Identifier: GPL-3.0-or-later
"""Three questions answered at a glance: is it locked, is it as good as it can be, how sure is that? In words, and as a view."""

from __future__ import annotations

from dataclasses import dataclass

from . import lettering, words
from .drawing import Bar, Drawing, Mark, Text

SIZE = (720.0, 92.0)
# Shortfalls up to a tenth of a decibel are called none; from one decibel on they are called large.
NONE_DB, LARGE_DB = 0.1, 1.0
MOST_EXCLUDED = 0.001
_SHAPE = {"good": "circle", "bad": "cross", "open": "ring", "quiet": "ring"}


@dataclass(frozen=True)
class Answer:
    """state: the role good, bad, open (not yet decided, or to be looked at), or quiet (not known)."""

    question: str
    state: str
    answer: str
    detail: str = ""


def answers(report: dict) -> tuple[Answer, Answer, Answer]:
    """The three answers; each says by itself what is not known yet."""
    return _locked(report), _as_good(report), _sure(report)


def _locked(report: dict) -> Answer:
    question, lock = "Locked?", report.get("lock", {})
    state = lock.get("state")
    if state is None and (unknown := _not_known_in_advance(report)):
        return Answer(question, "quiet", "No pattern to lock to", f"{words.percent(unknown)} of the symbols were not known in advance")
    if state is None:
        return Answer(question, "quiet", "Lock " + words.UNKNOWN)
    role, answer = {
        "held": ("good", "Locked"), "doubtful": ("open", "Lock in doubt"), "searching": ("open", "Searching"), "lost": ("bad", "Lock lost"),
    }.get(state, ("quiet", f"Lock {words.name(str(state))}"))  # fmt: skip
    return Answer(question, role, answer, words.lock(lock, report.get("total", {}).get("slips", 0)))


def _not_known_in_advance(report: dict) -> float:
    """Share of the symbols handed over."""
    total = report.get("total", {})
    unknown = total.get("live", 0) + total.get("decoded", 0)
    return unknown / (unknown + total.get("judged", 0)) if unknown else 0.0


def _live_only(report: dict) -> dict:
    """What was gauged blindly, where nothing could be judged."""
    total = report.get("total", {})
    part = total.get("live_part", {})
    return part if not total.get("judged") and "es_n0_db" in part else {}


def _as_good(report: dict) -> Answer:
    question, short = "As good as it can be?", report.get("shortfall", {})
    at, there = short.get("decision", {}), short.get("input", {})
    detail = f"at the input {words.shortfall(there)}" if "db" in there else ""
    if "db" not in at:
        if "db" in there:
            return Answer(question, _size(there), f"{words.db(there['db'])} dB short at the input", words.ends(there))
        if live := _live_only(report):
            return Answer(question, "quiet", "Nothing to hold it against", f"live traffic at Es/N0 {words.gauged(live)}, gauged blindly")
        return Answer(question, "quiet", words.UNKNOWN.capitalize(), "a shortfall takes some errors")
    low, high = at.get("db_low", at["db"]), at.get("db_high", at["db"])
    ends = words.ends(at)
    if high < -NONE_DB:
        answer, role = f"{words.db(-at['db'])} dB better than Gaussian noise", "open"
        detail = "; ".join(filter(None, ("what disturbs it is not Gaussian", detail)))
    elif low <= NONE_DB:
        answer, role = ("Yes" if high <= NONE_DB else "Yes, as far as one can tell"), "good"
        detail = "; ".join(filter(None, (f"at the decision {words.shortfall(at)}", detail)))
        # What the receiver loses ahead of its decision is still lost.
        if there.get("db_low", 0.0) > NONE_DB:
            answer, role = f"{words.db(there['db'])} dB short at the input", _size(there)
            detail = f"none of it at the decision ({words.db(at['db'])} dB)" if at["db"] <= NONE_DB else f"at the decision {words.shortfall(at)}"
    else:
        answer, role = f"{words.db(at['db'])} dB short at the decision", _size(at)
        detail = "; ".join(filter(None, (ends, detail)))
    return Answer(question, role, answer, detail)


def _size(fall: dict) -> str:
    low = fall.get("db_low", fall["db"])
    return "good" if low <= NONE_DB else "open" if low < LARGE_DB else "bad"


def _sure(report: dict) -> Answer:
    question, total, verdict = "How sure is that?", report.get("total", {}), report.get("verdict", {})
    said, role = words.certainty(total, report.get("confidence", 0.95))
    if role == "quiet":
        rate = _live_only(report).get("predicted", {}).get("exact", {}).get("ser")
        return Answer(question, "quiet", *(("Nothing is counted", f"SER {words.rate(rate)} is predicted of live traffic") if rate else (said,)))
    share = words.left_out(report)
    detail = words.counted(total)
    if share > MOST_EXCLUDED:
        detail += f"; {words.percent(share)} left out"
    if verdict.get("state") in words.VERDICTS:
        role = {"pass": "good", "fail": "bad", "undecided": "open"}[verdict["state"]]
        if verdict["state"] == "undecided" and "symbols_to_go" in verdict:
            detail = f"about {words.about(verdict['symbols_to_go'])} symbols to go; {detail}"
        return Answer(question, role, words.verdict(verdict), f"{said}; {detail}")
    return Answer(question, "open" if share > MOST_EXCLUDED else role, said, detail)


def heading(report: dict, settings: dict | None = None, size: tuple[float, float] = SIZE) -> Drawing:
    """The three answers side by side, one below the other where the width is below 560. As high as they need,
    whatever height is asked for."""
    width = size[0]
    found = answers(report)
    out = Drawing("heading", width, size[1], title="The link at a glance")
    out.description = " ".join(f"{each.question} {each.answer}" + (f": {each.detail}." if each.detail else ".") for each in found)
    side_by_side = width >= 560
    gap = 12.0
    room = (width - 2 * gap) / 3 if side_by_side else width
    y, lowest = 0.0, 0.0
    for k, each in enumerate(found):
        bottom = _draw_answer(out, each, k * (room + gap) if side_by_side else 0.0, y, room)
        lowest = max(lowest, bottom)
        y = 0.0 if side_by_side else bottom + 8
    out.height = lowest
    # Cards of one height: behind the words, so first in the list.
    if side_by_side:
        cards = [Bar(k * (room + gap), 0, room, out.height, "raised", None, round=4) for k in range(3)]
        edges = [Bar(k * (room + gap), 0, 4, out.height, each.state) for k, each in enumerate(found)]
        out.items = [*cards, *edges, *out.items]
    return out


def _draw_answer(out: Drawing, each: Answer, x: float, y: float, room: float) -> float:
    """Returns where it ends below."""
    left, inside = x + 16, room - 26
    lines = lettering.wrapped(each.detail, inside, 11) if each.detail else []
    head = lettering.wrapped(each.answer, inside - 18, 14, True)
    bottom = y + 22 + 19 * len(head) + 5 + 15 * len(lines) + 8
    if room == out.width:
        out.add(Bar(x, y, room, bottom - y, "raised", None, round=4), Bar(x, y, 4, bottom - y, each.state))
    out.add(Text(left, y + 19, each.question, "quiet", 11))
    out.add(Mark(left + 6, y + 35, _SHAPE[each.state], each.state, 9, note=each.answer))
    for k, line in enumerate(head):
        out.add(Text(left + 18, y + 40 + 19 * k, line, "ink", 14, bold=True))
    for k, line in enumerate(lines):
        out.add(Text(left, y + 40 + 19 * len(head) + 15 * k, line, "ink", 11))
    return bottom
