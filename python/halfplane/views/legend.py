# SPDX-License-Identifier: GPL-3.0-or-later
"""A legend that flows in rows below a picture, so that it never covers what it explains."""

from __future__ import annotations

from dataclasses import dataclass

from . import lettering
from .drawing import Bar, Drawing, Line, Mark, Text

ROW = 17.0
_KEY, _GAP, _SIZE = 24.0, 14.0, 11.0


@dataclass(frozen=True)
class Entry:
    """kind: "line", "swatch", "hatch" or the shape of a Mark."""

    kind: str
    role: str
    text: str
    width: float = 2.0
    dash: str = "solid"
    strength: float = 1.0
    sign: str = ""  # a mark upon a swatch


def rows(entries: list[Entry], room: float) -> list[list[Entry]]:
    """The entries in as many rows as the room asks for."""
    found: list[list[Entry]] = []
    x = room + 1
    for entry in entries:
        needed = _KEY + lettering.width(entry.text, _SIZE)
        if x + needed > room:
            found.append([])
            x = 0.0
        found[-1].append(entry)
        x += needed + _GAP
    return found


def height(entries: list[Entry], room: float) -> float:
    return ROW * len(rows(entries, room))


def draw(out: Drawing, entries: list[Entry], left: float, top: float, room: float) -> None:
    for k, row in enumerate(rows(entries, room)):
        x, y = left, top + ROW * k + 12
        for entry in row:
            _draw_key(out, entry, x, y)
            text = lettering.shortened(entry.text, room - _KEY, _SIZE)
            out.add(Text(x + _KEY, y, text, "quiet", _SIZE))
            x += _KEY + lettering.width(text, _SIZE) + _GAP


def _draw_key(out: Drawing, entry: Entry, x: float, y: float) -> None:
    if entry.kind == "line":
        out.add(Line(((x, y - 4), (x + 18, y - 4)), entry.role, entry.width, entry.dash))
    elif entry.kind in ("swatch", "hatch"):
        out.add(Bar(x, y - 11, 18, 14, entry.role, None, strength=entry.strength, hatch=entry.kind == "hatch", round=2))
        if entry.sign:
            out.add(Mark(x + 9, y - 4, entry.sign, "ink", 4 if entry.sign == "circle" else 8))
    else:
        out.add(Mark(x + 9, y - 4, entry.kind, entry.role, 8))
