# SPDX-License-Identifier: GPL-3.0-or-later
"""The terminal screen of one link: three answers, rates among their predictions, losses, premises, verdict."""

from __future__ import annotations

import os.path
import textwrap

from rich.console import Group
from rich.table import Table
from rich.text import Text

from . import live
from .cli import shown
from .views import glance, words
from .views.losses import REST, parts, whole

WIDEST = 110
_STYLES = {"good": shown.GOOD, "bad": shown.BAD, "open": shown.WARN, "quiet": shown.QUIET}
_SIGNS = {"good": "●", "bad": "✕", "open": "○", "quiet": "·"}


def screen(report: dict, name: str, width: int, remark: str = "") -> Group:
    """Everything about the latest report that a terminal of so many columns can show. remark: said in the head."""
    width = min(width, WIDEST)
    blocks = [_head(report, name, width, remark), _answers(report, width), *live.measured(report, width)]
    for block in (_losses(report, width), _premises(report), _verdict(report)):
        if block is not None:
            blocks += [Text(), block]
    return Group(*blocks)


def _head(report: dict, name: str, width: int, remark: str) -> Text:
    place = name if "://" in name else os.path.basename(name)
    left = " · ".join(filter(None, (report.get("set"), report.get("pattern"), place)))
    right = remark or report.get("time", "")
    left = left if len(left) + len(right) + 2 <= width else left[: max(0, width - len(right) - 3)] + "…"
    return Text.assemble((left, shown.STRONG), " " * max(1, width - len(left) - len(right)), (right, shown.WARN if remark else shown.QUIET))


def _answers(report: dict, width: int) -> Table:
    """Beside each other where there is room, else one below the other."""
    found = glance.answers(report)
    beside = width >= 90
    room = (width - 4) // 3 if beside else width
    cells = [_answer(each, room) for each in found]
    table = Table(box=None, show_header=False, pad_edge=False, padding=(0, 2, 1, 0) if beside else (0, 0, 0, 0))
    for _ in cells if beside else cells[:1]:
        table.add_column(no_wrap=True, width=room)
    for row in [cells] if beside else [[cell] for cell in cells]:
        table.add_row(*row)
    if not beside:
        table.add_row("")
    return table


def _answer(each: glance.Answer, room: int) -> Text:
    # textwrap keeps the groups of a number together, rich's own wrapping would not.
    head = textwrap.wrap(each.answer, room - 2)
    text = Text.assemble((each.question + "\n", shown.QUIET), (f"{_SIGNS[each.state]} ", _STYLES[each.state]), ("\n  ".join(head), shown.STRONG))
    for line in textwrap.wrap(each.detail, room):
        text.append("\n" + line)
    return text


def _losses(report: dict, width: int) -> Table | None:
    if not report.get("losses"):
        return None
    found, total = parts(report)
    largest = max(abs(db) for _, db, _ in found) or 1.0
    room = max(10, width - 44)
    table = shown.table("loss", "dB", title="Where the decibels go")
    table.columns[0].justify = "left"
    table.add_column("", justify="left", no_wrap=True)
    for cause, db, _ in found:
        bar = ("░" if cause in REST else "█") * max(0, round(room * abs(db) / largest))
        table.add_row(words.name(cause), f"{round(db, 2) + 0.0:+.2f}", Text(bar, style="cyan"))
    if total is not None:
        table.add_row(Text(whole(report), style=shown.STRONG), Text(shown.db(total), style=shown.STRONG), "")
    return table


def _premises(report: dict) -> Table | None:
    if not report.get("premises"):
        return None
    pairs = []
    for each in report["premises"]:
        role = words.PREMISE_STATES.get(each.get("state"), ("quiet", ""))[0]
        pairs.append((words.name(each.get("name", "")), Text(f"{_SIGNS[role]} {words.premise(each)}", style=_STYLES[role] if role != "good" else "")))
    return shown.facts(pairs, title="What the predictions take for granted")


def _verdict(report: dict) -> Text | None:
    found = report.get("verdict")
    if not found:
        return None
    role = {"pass": "good", "fail": "bad", "undecided": "open"}.get(found.get("state"), "quiet")
    text = words.verdict(found)
    if found.get("state") == "undecided" and "symbols_to_go" in found:
        text += f", about {words.about(found['symbols_to_go'])} symbols to go"
    return Text(text, style=f"bold {_STYLES[role]}")
