# SPDX-License-Identifier: GPL-3.0-or-later
"""Scales from values to places in a drawing, with their ticks."""

from __future__ import annotations

import math

from . import lettering, words
from .drawing import Drawing, Text


class LogAxis:
    """
    A horizontal or vertical logarithmic scale over positive values, with some air at both ends.

    values: what must be on it. low_end, high_end: where it starts and ends in the drawing (low_end may be the greater).
    least_decades: it never shows less than so much, so that noise does not fill the view.
    """

    def __init__(self, values, low_end: float, high_end: float, least_decades: float = 0.5, air: float = 0.06):
        low, high = math.log10(min(values)), math.log10(max(values))
        missing = max(0.0, least_decades - (high - low)) / 2
        low, high = low - missing, high + missing
        margin = air * (high - low)
        self.low, self.high = low - margin, high + margin
        self.low_end, self.high_end = low_end, high_end

    def __call__(self, value: float) -> float:
        return self.at_log(math.log10(value))

    def at_log(self, log10: float) -> float:
        return self.low_end + (log10 - self.low) / (self.high - self.low) * (self.high_end - self.low_end)

    def ticks(self) -> list[tuple[float, str]]:
        """(value, label), ascending: decades, and 2 and 5, or every digit, between them where few decades show."""
        span = self.high - self.low
        digits = (1,) if span > 3 else (1, 2, 5) if span > 1 else range(1, 10)
        skip = max(1, math.ceil(span / 12))
        found = []
        for decade in range(math.floor(self.low), math.ceil(self.high) + 1):
            if span > 3 and decade % skip:
                continue
            for digit in digits:
                if self.low <= decade + math.log10(digit) <= self.high:
                    value = digit * 10.0**decade
                    found.append((value, words.power_of_ten(decade) if digit == 1 and not -3 < decade < 0 else words.rate(value, 1)))
        return found

    def draw_labels(self, out: Drawing, y: float, size: float = 11.0) -> None:
        """Labels of the ticks along a horizontal axis; those without room are left out, decades last."""
        taken: list[tuple[float, float]] = []
        ticks = sorted(self.ticks(), key=lambda tick: (not _is_decade(tick[0]), _digit(tick[0]) not in (2, 5), tick[0]))
        for value, label in ticks:
            room = lettering.width(label, size)
            left = self(value) - room / 2
            if left < 0 or left + room > out.width or any(left < b + 8 and a - 8 < left + room for a, b in taken):
                continue
            taken.append((left, left + room))
            out.add(Text(self(value), y, label, "quiet", size, "middle"))


def _digit(value: float) -> int:
    return round(value / 10.0 ** math.floor(math.log10(value) + 1e-9))


def _is_decade(value: float) -> bool:
    return _digit(value) == 1


class LinearAxis:
    """
    A linear scale from `low` … `high` in values to `low_end` … `high_end` in the drawing; most: about how many ticks at most.
    """

    def __init__(self, low: float, high: float, low_end: float, high_end: float, most: int = 6):
        if not high > low:
            low, high = low - 0.5, high + 0.5
        self.low, self.high, self.low_end, self.high_end = low, high, low_end, high_end
        rough = (high - low) / max(1, most)
        power = 10.0 ** math.floor(math.log10(rough))
        self.step = next(m * power for m in (1, 2, 5, 10) if m * power >= rough * (1 - 1e-9))

    def __call__(self, value: float) -> float:
        return self.low_end + (value - self.low) / (self.high - self.low) * (self.high_end - self.low_end)

    def ticks(self) -> list[tuple[float, str]]:
        """(value, label), ascending, at multiples of 1, 2 or 5 times a power of ten."""
        digits = max(0, -math.floor(math.log10(self.step) + 1e-9))
        first = math.ceil(self.low / self.step - 1e-9)
        last = math.floor(self.high / self.step + 1e-9)
        return [(k * self.step, self._label(k * self.step, digits)) for k in range(first, last + 1)]

    def _label(self, value: float, digits: int) -> str:
        if digits > 6 or abs(value) >= 1e7:
            return f"{value:.3g}".replace("-", "−")
        return f"{value + 0.0:.{digits}f}".replace("-", "−")


def clipped(line: list[tuple[float, float]], top: float, bottom: float) -> list[tuple[tuple[float, float], ...]]:
    """The pieces of a polyline between two heights of a drawing, cut where it crosses them."""
    pieces: list[list[tuple[float, float]]] = []
    last_end = None
    for (x1, y1), (x2, y2) in zip(line, line[1:]):
        if max(y1, y2) < top or min(y1, y2) > bottom:
            last_end = None
            continue
        ends = []
        for x, y in ((x1, y1), (x2, y2)):
            inside = min(max(y, top), bottom)
            ends.append((x, y) if inside == y else (x1 + (x2 - x1) * (inside - y1) / (y2 - y1), inside))
        if last_end == ends[0]:
            pieces[-1].append(ends[1])
        else:
            pieces.append(ends)
        last_end = ends[1]
    return [tuple(piece) for piece in pieces]
