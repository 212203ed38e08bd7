# SPDX-License-Identifier: GPL-3.0-or-later
"""Logs as link_log writes them, of made-up runs."""

import json

import sample_reports
from command import FIRN
from gnuradio.halfplane import load_set

DIGEST = "5f" * 32


def settings_of(signal_set, detector="ml"):
    """As watch::settings() writes them."""
    found = {
        "set": signal_set.name, "points": [[p.real, p.imag] for p in signal_set.points], "labels": signal_set.label_strings,
        "pattern": "draw:2026", "law": "awgn", "detector": detector, "decisions": "own", "confidence": 0.95, "window": 10000,
        "symbol_rate": 50000.0, "target": "ser:1e-3", "max_excluded": 0.001,
    }  # fmt: skip
    if not signal_set.uniform:
        found["priors"] = list(signal_set.priors)
    return found


def settings():
    return settings_of(load_set(FIRN))


def settings_line(of=None, digest=DIGEST):
    return {"schema": "halfplane/settings/1", "settings_sha256": digest, "settings": of or settings()}


def run(es_n0_db=12.0, number=5, verdict=None, full=True):
    """The reports of one run: counts grow to those of sample_reports."""
    last = sample_reports.full() if full and es_n0_db == 12.0 else sample_reports.step(es_n0_db)
    last.update(version="0.1.0", settings_sha256=DIGEST, detector="ml", decisions="own", confidence=0.95)
    last.pop("verdict", None)
    if verdict:
        last["verdict"] = {"target": {"ser": 1e-3}, "state": verdict, "log_wealth_pass": 1.0, "log_wealth_fail": -1.0}
    for k in range(1, number + 1):
        report = {**last, "total": dict(last["total"])}
        report["sequence"], report["time"] = k - 1, f"2026-03-01T06:00:{k % 60:02d}.000Z"
        for key in ("in", "judged", "symbols", "bits", "symbol_errors", "bit_errors"):
            report["total"][key] = report["total"][key] * k // number
        yield report


def write(path, *parts):
    """Documents and raw text, one a line → the path."""
    with open(path, "w", encoding="utf-8") as stream:
        for part in parts:
            stream.write(part if isinstance(part, str) else json.dumps(part) + "\n")
    return path
