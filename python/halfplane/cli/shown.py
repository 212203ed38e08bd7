# SPDX-License-Identifier: GPL-3.0-or-later
"""How numbers and tables look on a terminal."""

import math
import sys

from rich.console import Console
from rich.table import Table
from rich.text import Text

# One look for the whole project; the same roles as in plots.style, in terminal colours.
PIPE_WIDTH = 160
STRONG, QUIET, GOOD, BAD, WARN = "bold", "dim", "green", "red", "yellow"


def console(stream=None):
    """A console that never colours a file or a pipe, and is wide enough there for any table."""
    stream = stream or sys.stdout
    return Console(file=stream, width=None if stream.isatty() else PIPE_WIDTH, highlight=False)


def show(*parts):
    """
    Prints to stdout; into a file or a pipe without the blanks that fill a table's last column. On a terminal that is too narrow
    for a table its columns stand in several, one below the other: no figure is ever cut.
    """
    out = console()
    if out.is_terminal:
        out.print(*(piece for part in parts for piece in (_fitting(part, out) if isinstance(part, Table) else [part])), sep="\n")
        return
    with out.capture() as text:
        out.print(*parts, sep="\n")
    sys.stdout.write("".join(line.rstrip() + "\n" for line in text.get().splitlines()))


def _fitting(whole, out):
    """The table, or tables with as many of its columns as fit, each led by the first."""
    figures = all(column.justify == "right" and column.no_wrap for column in whole.columns)
    if not figures or _width(whole, out) <= out.width:
        return [whole]
    first, *others = whole.columns
    pieces, shown = [], [first]
    for column in others:
        if len(shown) > 1 and _width(_of_columns(whole, [*shown, column]), out) > out.width:
            pieces.append(shown)
            shown = [first]
        shown.append(column)
    return [_of_columns(whole, columns, titled=k == 0) for k, columns in enumerate([*pieces, shown])]


def _width(whole, out):
    return out.measure(whole, options=out.options.update_width(10_000)).maximum


def _of_columns(whole, columns, titled=True):
    piece = table(*((column.header, column.style or None) for column in columns), title=whole.title if titled else None)
    for cells in zip(*(column.cells for column in columns)):
        piece.add_row(*cells)
    return piece


def quiet(text):
    """A remark below what was asked for."""
    return Text(text, style=QUIET)


def table(*columns, title=None):
    """An open table: a head, a rule, right-aligned figures. A column is its head, or (head, style)."""
    result = Table(
        title=title, title_justify="left", title_style=STRONG, box=_RULE, show_edge=False, pad_edge=False,
        header_style=STRONG, padding=(0, 1, 0, 0),
    )  # fmt: skip
    for column in columns:
        head, style = (column, None) if isinstance(column, str) else column
        result.add_column(head, justify="right", style=style, no_wrap=True)
    return result


def facts(pairs, title=None):
    """Name and value, two columns; pairs whose value is None are left out."""
    result = Table(
        title=title, title_justify="left", title_style=STRONG, box=None, show_header=False, pad_edge=False,
        padding=(0, 2, 0, 0),
    )  # fmt: skip
    result.add_column(style=QUIET, no_wrap=True)
    result.add_column(overflow="fold")
    for name, value in pairs:
        if value is not None:
            result.add_row(name, value if isinstance(value, Text) else str(value))
    return result


def rate(value, ln=None, digits=3):
    """An error rate, 4.321e-05; below the smallest double from its natural logarithm; a dash where not known."""
    if value == 0 and ln is None:
        return "0"
    if value is not None and (value >= 1e-300 or ln is None):
        return f"{value:.{digits}e}"
    if ln is None or not math.isfinite(ln):
        return "–"
    exponent = math.floor(ln / math.log(10))
    mantissa = math.exp(ln - exponent * math.log(10))
    if round(mantissa, digits) >= 10:
        mantissa, exponent = 1.0, exponent + 1
    return f"{mantissa:.{digits}f}e{exponent}"


def db(value, digits=2):
    """Decibels; a dash where not known; no minus sign before a zero."""
    if value is None:
        return "–"
    return f"{round(value, digits) + 0.0:.{digits}f}"


def span(low, high, digits=3):
    """An interval of rates; only the upper end stands where no error was counted."""
    if high is None:
        return "–"
    if low is None:
        return f"≤ {rate(high, digits=digits)}"
    return f"{rate(low, digits=digits)} … {rate(high, digits=digits)}"


def count(value):
    """A whole number in groups of three."""
    return f"{value:,}".replace(",", "\u202f")


def _rule():
    from rich.box import Box

    return Box("    \n    \n ── \n    \n    \n    \n    \n    \n")


_RULE = _rule()
