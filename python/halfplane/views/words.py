# SPDX-License-Identifier: GPL-3.0-or-later
"""Numbers and states of a report in words, the same in every view."""

from __future__ import annotations

import math

UNKNOWN = "not known yet"
RUNGS = ("exact", "facing", "union", "nearest")
# What stands before a rung's name: how its figure stands to the rate that it predicts.
_RELATION = {
    "ser": {"exact": "", "facing": "≤ ", "union": "≤ ", "nearest": "≈ "},
    "ber": {"exact": "", "facing": "≈ ", "union": "≤ ", "nearest": "≈ "},
}
KINDS = {"ser": "symbol error rate", "ber": "bit error rate", "fer": "frame error rate"}
CAUSES = {"before_lock": "before lock", "slip": "slip", "signal_lost": "signal lost", "overflow": "samples lost"}

_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def power_of_ten(exponent: int) -> str:
    return "1" if exponent == 0 else "10" + str(exponent).translate(_RAISED)


def rate(value: float | None, digits: int = 3) -> str:
    """A probability with so many significant digits: 1.23·10⁻⁴; plain from 0.01 on."""
    if value is None:
        return UNKNOWN
    if value == 0:
        return "0"
    if value >= 0.01:
        return f"{value:.{digits - 1 - math.floor(math.log10(value) + 1e-12)}f}" if value < 1 else f"{value:.{digits - 1}f}"
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa}·{power_of_ten(int(exponent))}"


def interval(low: float | None, high: float | None, digits: int = 3) -> str:
    """An interval of rates; open below where no error was counted."""
    if high is None:
        return UNKNOWN
    if not low:
        return f"below {rate(high, digits)}"
    return f"{rate(low, digits)} to {rate(high, digits)}"


def db(value: float | None, digits: int = 2) -> str:
    """Decibels with a true minus sign; no sign before a zero."""
    if value is None:
        return UNKNOWN
    return f"{round(value, digits) + 0.0:.{digits}f}".replace("-", "−")


def count(value: int | float) -> str:
    """A whole number in groups of three."""
    return f"{round(value):,}".replace(",", "\u202f")


def rung(name: str, kind: str) -> str:
    """A rung's name with its relation to the rate: '≤ union'."""
    return _RELATION[kind][name] + name


def against(measured: float, low: float | None, high: float | None, exact: float) -> tuple[str, str]:
    """
    How a measured rate stands to the exact one → (role, words). Decided by whether the interval holds the exact rate,
    never by the estimate alone.
    """
    if high is not None and exact > high:
        return "fewer", f"{factor(measured / exact)} of exact" if measured > 0 else "fewer than predicted"
    if low is not None and exact < low:
        return "more", f"{factor(measured / exact)} × exact"
    return "even", "as predicted within the interval"


def factor(value: float) -> str:
    """A ratio with three significant digits up to a hundred."""
    if value == 0:
        return "0"
    digits = max(0, 2 - math.floor(math.log10(value)))
    return f"{value:.{min(digits, 4)}f}"
