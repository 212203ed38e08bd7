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
    # Mutual information is known here for AWGN, whatever the detector.
    known = core.information(signal_set, values) if predictor.law == "awgn" else {}
    rows = []
    for k, value in enumerate(values):
        row = {"es_n0_db": float(value), "eb_n0_db": eb_n0_db(signal_set, float(value))}
        if known:
            row["information"] = carried = {figure: float(known[figure][k]) for figure in ("mi", "bmd_rate")}
            for figure, gap in (("mi", "mi_gap_db"), ("bmd_rate", "bmd_gap_db")):
                if carried[figure] > core.information_accuracy:
                    carried[gap] = float(core.capacity_gap_db(value, carried[figure]))
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


def require(predictor, kind, target, rung):
    """The Es/N0 that a target SER or BER needs on one rung. kind: 'ser' or 'ber'."""
    solve = {"ser": predictor.es_n0_db_for_ser, "ber": predictor.es_n0_db_for_ber}[kind]
    es_n0_db = float(solve(target, rung))
    return {
        "es_n0_db": es_n0_db,
        "eb_n0_db": eb_n0_db(predictor.set, es_n0_db),
        "rung": rung,
        "law": predictor.law,
        "detector": predictor.detector,
        "target": {kind: target},
        "shannon_gap_db": float(core.shannon_gap_db(predictor.set, es_n0_db)),
    }


def _predicted(predictor, es_n0_db, means):
    """Exact rates with points received at `means` (None: where they stand), and the other rungs, which know no means."""
    rungs = predictor.rates(es_n0_db)
    arrays = rungs["exact"] if means is None else predictor.displaced(es_n0_db, means)
    exact = {kind: float(arrays[kind]) for kind in ("ser", "ber")}
    others = {rung: {kind: float(rungs[rung][kind]) for kind in ("ser", "ber") if rungs[rung][kind] > 0} for rung in RUNGS if rung != "exact"}
    return exact, others


def counted_row(predictor, es_n0_db, counts, confidence=0.95, means=None):
    """One row of `simulate`: a tally beside the exact rates and the other rungs."""
    exact, others = _predicted(predictor, es_n0_db, means)
    row = {"es_n0_db": es_n0_db, "eb_n0_db": eb_n0_db(predictor.set, es_n0_db)}
    row.update({field: getattr(counts, field) for field in ("symbols", "symbol_errors", "bits", "bit_errors")})
    if counts.symbols:
        row["ser"] = counts.symbol_errors / counts.symbols
        row["ber"] = counts.bit_errors / counts.bits
        ser = core.binomial_interval(counts.symbol_errors, counts.symbols, confidence)
        ber = core.clumped_interval(counts.bit_errors, counts.bits, counts.bit_dispersion, confidence)
        for kind, ends in (("ser", ser), ("ber", ber)):
            row.update({f"{kind}_{end}": value for end, value in zip(("low", "high"), ends) if value is not None})
        spread = math.sqrt(counts.symbols * exact["ser"] * (1 - exact["ser"]))
        if spread > 0:
            row["z"] = (counts.symbol_errors - counts.symbols * exact["ser"]) / spread
    row["exact"] = {kind: rate for kind, rate in exact.items() if rate > 0}
    row.update(others)
    return row


def rare_row(predictor, es_n0_db, estimate, means=None):
    """One row of `simulate --rare`: an estimate by importance sampling, which counts no errors."""
    exact, others = _predicted(predictor, es_n0_db, means)
    row = {"es_n0_db": es_n0_db, "eb_n0_db": eb_n0_db(predictor.set, es_n0_db), "symbols": estimate["symbols"]}
    for kind in ("ser", "ber"):
        half = 1.959964 * estimate[kind + "_se"]
        row[kind], row[kind + "_se"] = estimate[kind], estimate[kind + "_se"]
        row[kind + "_low"], row[kind + "_high"] = max(0.0, estimate[kind] - half), estimate[kind] + half
    row["exact"] = {kind: rate for kind, rate in exact.items() if rate > 0}
    row.update(others)
    if estimate["ser_se"] > 0:
        row["z"] = (estimate["ser"] - exact["ser"]) / estimate["ser_se"]
    return row
