# SPDX-License-Identifier: GPL-3.0-or-later
"""Counted or estimated rates of `simulate` with their intervals, over the four rungs."""

import math

import numpy as np

from . import curves, style


def span(rows):
    """Es/N0 values for the curves below the rows, one dB beyond them on each side."""
    values = [row["es_n0_db"] for row in rows]
    return np.linspace(min(values) - 1, max(values) + 1, 81)


@style.styled
def draw(document, curve, path):
    """Draws a document of `simulate` over a document of `curve` into a file: .svg, .png or .pdf."""
    made, panels = style.figure(9.6, 4.6, columns=2, sharex=True)
    for axes, kind in zip(panels, ("ser", "ber")):
        curves.rungs(axes, curve["rows"], kind)
        rows = [row for row in document["rows"] if row.get(kind, 0) > 0]
        if rows:
            y = np.array([math.log10(row[kind]) for row in rows])
            # An estimate may be less sure than its own size: such a bar reaches one decade down.
            below = y - [math.log10(max(row.get(kind + "_low", 0), row[kind] / 10)) for row in rows]
            above = [math.log10(row[kind + "_high"]) for row in rows] - y
            look = {**style.BARS, **next(iter(style.MEASURED.values())), "zorder": 5}
            axes.errorbar([row["es_n0_db"] for row in rows], y, [below, above], label=document["method"], **look)
            rates = [row[kind] for row in rows] + [row["exact"][kind] for row in rows if kind in row["exact"]]
            style.log_rate_axis(axes, math.log(min(rates)) - 0.7 * math.log(10))
        axes.set_title(curves.TITLES[kind])
        axes.set_xlabel(style.ES_N0 + " (dB)")
        axes.set_ylabel(kind.upper())
        curves.eb_axis(axes, curve["rows"])
        axes.legend(*curves.in_order(axes), loc="lower left")
    facts = document["set"]
    moved = " · points moved, curves without" if "means" in document else ""
    style.headline(made, f"{facts.get('name') or 'set'} · {facts['size']} points · {document['law']} · seed {document['seed']}{moved}")
    style.save(made, path)
