# SPDX-License-Identifier: GPL-3.0-or-later
"""The JSON documents of the commands, as plain dicts; one function a document, usable from scripts as well."""

import json
import math
import re

import numpy as np

from . import core_python as core

RUNGS = ("exact", "facing", "union", "nearest")


def dumps(document):
    """One JSON document, a list of plain values on one line; refuses what JSON has no word for."""
    text = json.dumps(document, indent=2, allow_nan=False, ensure_ascii=False)
    return re.sub(r"\[\n\s+([^\[\]{}]*?)\n\s+\]", lambda found: "[" + re.sub(r",\n\s+", ", ", found[1]) + "]", text)


def eb_n0_db(signal_set, es_n0_db):
    """Eb/N0 in dB at an Es/N0 in dB, Eb = Es / H."""
    return es_n0_db - 10 * math.log10(signal_set.entropy_bits)


def _rung(arrays, k):
    """One rung at one Es/N0. A rate below the smallest double is given by its logarithm alone."""
    figures = {}
    for rate in ("ser", "ber", "ber_if_gray"):
        value = float(arrays[rate][k])
        if value > 0:
            figures[rate] = value
    figures["ln_ser"] = float(arrays["ln_ser"][k])
    figures["ln_ber"] = float(arrays["ln_ber"][k])
    return figures


def _unused_bits(signal_set):
    """Label positions at which all labels agree: they never err, and a zero there is the truth."""
    labels = signal_set.labels
    b = signal_set.label_bits
    return [len(set((labels >> (b - 1 - k)) & 1)) == 1 for k in range(b)]


def curve_rows(predictor, es_n0_db):
    """The rows of `curve`: every rung at every Es/N0 (a sequence of dB)."""
    signal_set = predictor.set
    values = np.asarray(es_n0_db, dtype=float)
    arrays = predictor.rates(values)
    unused = _unused_bits(signal_set)
    rows = []
    for k, value in enumerate(values):
        row = {"es_n0_db": float(value), "eb_n0_db": eb_n0_db(signal_set, float(value))}
        row.update({rung: _rung(arrays[rung], k) for rung in RUNGS})
        exact = arrays["exact"]
        by_bit, by_point = exact["ber_by_bit"][k], exact["ser_by_point"][k]
        # A list with a vanished entry would show a zero that is none, so it is left out as a whole.
        if all(rate > 0 or free for rate, free in zip(by_bit, unused)):
            row["exact"]["ber_by_bit"] = by_bit.tolist()
        if by_point.min() > 0:
            row["exact"]["ser_by_point"] = by_point.tolist()
        rows.append(row)
    return rows


def inspect(signal_set, tolerance=core.default_tolerance):
    """The facts of a constellation; distances, edges and symmetries are equal within tolerance · d_min."""
    return core.inspect(signal_set, tolerance)


def curve(predictor, es_n0_db):
    """Every rung of a predictor at every Es/N0 (a sequence of dB)."""
    return {
        "set": inspect(predictor.set),
        "law": predictor.law,
        "detector": predictor.detector,
        "rows": curve_rows(predictor, es_n0_db),
    }
