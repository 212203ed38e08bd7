# SPDX-License-Identifier: GPL-3.0-or-later
"""
The vocabulary of every view: a drawing is a list of primitives whose colours are named by what they mean.

Coordinates run to the right and down from the upper left corner; one unit is a CSS pixel at 100 %, so a renderer that
scales a drawing scales text and lines with it. A renderer (svg, the Qt panel) knows these primitives, the roles below
and nothing about links.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

# What a colour is for → shown by a theme (themes.py). A role is never the only carrier of a meaning: shapes, hatching, signs
# and words say the same in greyscale.
ROLES = (
    "ground",  # behind everything
    "raised",  # a surface on the ground
    "rule",  # grids and frames
    "ink",  # text and what matters
    "quiet",  # text and lines of the second rank
    "measured",  # what was counted on the link
    "measured_soft",  # its interval
    "exact", "facing", "union", "nearest",  # the four rungs
    "target",  # what the link must reach
    "more", "fewer", "even",  # against expectation
    "gap", "slip", "overflow", "lost", "before",  # why symbols are left out
    "loss", "rest",  # dB by cause, and what no cause explains
    "good", "bad", "open",  # passed or locked, failed or lost, undecided
)  # fmt: skip

DASHES = {"solid": (), "dash": (6.0, 3.0), "dot": (1.5, 2.5), "dashdot": (7.0, 2.5, 1.5, 2.5)}
ANCHORS = ("start", "middle", "end")
# Marks other than "circle" and "ring" (an open circle): corners of filled ones, strokes of the others, in halves of their
# size from the centre.
CORNERS = {
    "square": ((-0.9, -0.9), (0.9, -0.9), (0.9, 0.9), (-0.9, 0.9)),
    "diamond": ((0, -1.15), (1.15, 0), (0, 1.15), (-1.15, 0)),
    "up": ((0, -1), (1, 0.85), (-1, 0.85)),
    "down": ((0, 1), (1, -0.85), (-1, -0.85)),
    "left": ((-1, 0), (0.85, 1), (0.85, -1)),
}
STROKES = {
    "cross": ((-0.8, -0.8, 0.8, 0.8), (-0.8, 0.8, 0.8, -0.8)),
    "plus": ((-1, 0, 1, 0), (0, -1, 0, 1)),
    "minus": ((-1, 0, 1, 0),),
}
SHAPES = ("circle", "ring", *CORNERS, *STROKES)


@dataclass(frozen=True)
class Line:
    """A polyline. dash: a key of DASHES."""

    points: tuple[tuple[float, float], ...]
    role: str = "ink"
    width: float = 1.0
    dash: str = "solid"
    note: str = ""


@dataclass(frozen=True)
class Bar:
    """
    A rectangle. role None: no filling; edge None: no outline. strength: opacity of the filling, 0 to 1. hatch: diagonal
    lines in the edge's role over the filling. round: radius of the corners. note, here and elsewhere: shown where the
    pointer rests, and read aloud.
    """

    x: float
    y: float
    width: float
    height: float
    role: str | None = "ink"
    edge: str | None = None
    edge_width: float = 1.0
    strength: float = 1.0
    hatch: bool = False
    round: float = 0.0
    note: str = ""


@dataclass(frozen=True)
class Polygon:
    """A closed outline; role, edge, strength, hatch and note as of Bar."""

    points: tuple[tuple[float, float], ...]
    role: str | None = "ink"
    edge: str | None = None
    edge_width: float = 1.0
    strength: float = 1.0
    hatch: bool = False
    note: str = ""


@dataclass(frozen=True)
class Arrow:
    """From (x1, y1) with its tip at (x2, y2); width of the shaft, the head is wider in proportion."""

    x1: float
    y1: float
    x2: float
    y2: float
    role: str = "ink"
    width: float = 1.0
    strength: float = 1.0
    note: str = ""

    def outline(self) -> tuple[tuple[float, float], ...]:
        """The arrow as a polygon, the same in every renderer; empty where it has no length."""
        dx, dy = self.x2 - self.x1, self.y2 - self.y1
        length = (dx * dx + dy * dy) ** 0.5
        if length == 0:
            return ()
        ux, uy = dx / length, dy / length
        half, wing = self.width / 2, max(2.6, 1.15 * self.width + 1.2)
        neck = max(0.0, length - min(length, 2.0 * wing))
        sides = ((0.0, half), (neck, half), (neck, wing), (length, 0.0), (neck, -wing), (neck, -half), (0.0, -half))
        return tuple((self.x1 + ux * along - uy * aside, self.y1 + uy * along + ux * aside) for along, aside in sides)


@dataclass(frozen=True)
class Mark:
    """A small sign centred at (x, y); size: its full width. shape: one of SHAPES."""

    x: float
    y: float
    shape: str = "circle"
    role: str = "ink"
    size: float = 7.0
    note: str = ""


@dataclass(frozen=True)
class Cloud:
    """Many dots of one role. layer, here and of Text: what a page may show and hide by itself (svg.py); "" for what is always shown."""

    points: tuple[tuple[float, float], ...]
    role: str = "quiet"
    size: float = 1.6
    strength: float = 0.35
    layer: str = ""


@dataclass(frozen=True)
class Text:
    """One line of text; y is its baseline. anchor: which part of it stands at x. halo: an outline of the ground, to read it on lines."""

    x: float
    y: float
    text: str
    role: str = "ink"
    size: float = 12.0
    anchor: str = "start"
    bold: bool = False
    halo: bool = False
    note: str = ""
    layer: str = ""


Primitive = Line | Bar | Polygon | Arrow | Mark | Cloud | Text


@dataclass
class Drawing:
    """
    A picture of one view. title: what it shows, in a few words; description: what it says, in whole sentences with
    numbers, for whoever cannot see it.
    """

    view: str
    width: float
    height: float
    title: str = ""
    description: str = ""
    items: list[Primitive] = field(default_factory=list)

    def add(self, *items: Primitive) -> None:
        self.items.extend(items)

    def place(self, other: Drawing, x: float, y: float) -> None:
        """Sets another drawing into this one with its corner at (x, y)."""
        self.items.extend(moved(item, x, y) for item in other.items)

    def texts(self) -> list[str]:
        """Everything written in it, in order."""
        return [item.text for item in self.items if isinstance(item, Text)]


def moved(item: Primitive, dx: float, dy: float) -> Primitive:
    """The same primitive elsewhere."""
    if isinstance(item, (Line, Polygon, Cloud)):
        return replace(item, points=tuple((x + dx, y + dy) for x, y in item.points))
    if isinstance(item, Arrow):
        return replace(item, x1=item.x1 + dx, y1=item.y1 + dy, x2=item.x2 + dx, y2=item.y2 + dy)
    return replace(item, x=item.x + dx, y=item.y + dy)
