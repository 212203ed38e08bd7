# SPDX-License-Identifier: GPL-3.0-or-later
"""What is drawn, taken apart: numbers read back, texts that overlap, tiles and bars; and reports with counts to draw."""

import itertools

import numpy as np
from gnuradio.halfplane import predictor
from gnuradio.halfplane.views import drawing, lettering


RAISED = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")


def number(text):
    """The value of a rate as words.rate writes it."""
    if "·10" in text:
        mantissa, exponent = text.split("·10")
        return float(mantissa) * 10.0 ** int(exponent.translate(RAISED))
    return float(text)


def overlaps(shown):
    """Pairs of texts that lie on one another."""
    return [
        (a[4], b[4])
        for a, b in itertools.combinations(lettering.boxes(shown), 2)
        if a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]
    ]


def outside(shown):
    return [box[4] for box in lettering.boxes(shown) if box[0] < 0 or box[1] < 0 or box[2] > shown.width or box[3] > shown.height]


def tiles(shown):
    return [item for item in shown.items if isinstance(item, drawing.Polygon)]


def bars(shown, role):
    return [item for item in shown.items if isinstance(item, drawing.Bar) and item.role == role and item.note]


def counted(signal_set, es_n0_db, sent, factor=lambda i, j: 1.0, seed=1, detector="automatic"):
    """A report whose transitions are drawn from Poisson counts, `factor` times their expectation."""
    exact = predictor(signal_set, "awgn", detector)
    chances, draw = exact.transitions(es_n0_db), np.random.default_rng(seed)
    rows = []
    for i, j in itertools.permutations(range(signal_set.size), 2):
        expected = sent[i] * chances[i, j]
        if number := int(draw.poisson(expected * factor(i, j))):
            rows.append([i, j, number, expected])
    symbols = int(sum(sent))
    total = {
        "symbols": symbols, "judged": symbols, "symbol_errors": sum(row[2] for row in rows), "es_n0_db": es_n0_db, "transitions": rows,
        "predicted": {"exact": {"ser": float(sum(n * s for n, s in zip(sent, exact.rates(es_n0_db)["exact"]["ser_by_point"])) / symbols)}},
    }  # fmt: skip
    return {"total": total, "lock": {"state": "held"}}
