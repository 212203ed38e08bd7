# SPDX-License-Identifier: GPL-3.0-or-later
"""
The acceptance report as one document: what `halfplane report --json` prints, what the page shows, what a later report is
held against. The same logs give the same document.

    {"schema": "halfplane/acceptance/1", "version", "job", "logs": [{"file", "sha256", "bytes", "reports", "torn_lines"}],
     "settings": {…}, "points": [{"log", "lines": [first, last], "first_time", "report": {…the log's last report of the run…}}],
     "verdict": "pass|fail|undecided",
     "against": {"file", "sha256", "job", "points": [{"es_n0_db", "ser", …, "shortfall_change_db": {place: {db, db_low, db_high}}} or {}]}}

job, settings, verdict and against stand where they are known or asked for. A point of the baseline belongs to the point
whose Es/N0 lies within half a decibel of its own, the nearest one; {} where there is none.
"""

from __future__ import annotations

import hashlib
import json
import math
from pathlib import Path

from .. import core_python as core
from ..views import source

SCHEMA = "halfplane/acceptance/1"
SAME_POINT_DB = 0.5


def of_logs(logs: source.Logs, job: str | None = None) -> dict:
    """The document of logs that were read."""
    document: dict = {"schema": SCHEMA, "version": core.__version__}
    if job:
        document["job"] = job
    document["logs"] = [
        {"file": log.name, "sha256": log.sha256, "bytes": log.size, "reports": log.reports, **({"torn_lines": log.torn} if log.torn else {})}
        for log in logs.logs
    ]
    known = [run.settings for run in logs.runs if run.settings is not None]
    if known:
        # What differs between runs (the window, a target) is no setting of all.
        document["settings"] = {key: value for key, value in known[0].items() if all(each.get(key) == value for each in known)}
    document["points"] = [
        {"log": run.log, "lines": [run.first_line, run.last_line], "first_time": run.first_time, "report": run.report} for run in logs.runs
    ]
    states = [run.report.get("verdict", {}).get("state") for run in logs.runs]
    if any(states):
        document["verdict"] = overall(states)
    return document


def overall(states) -> str:
    """One verdict in all: fails where one fails, passes where all pass, else undecided (also where one has none)."""
    if "fail" in states:
        return "fail"
    return "pass" if all(state == "pass" for state in states) else "undecided"


def set_against(document: dict, path: str | Path) -> None:
    """Sets a stored report beside a document, point by point. ValueError names the file where it is none, or of another set."""
    raw = Path(path).read_bytes()
    try:
        baseline = json.loads(raw)
    except ValueError as error:
        raise ValueError(f"{path}: no JSON: {error}") from None
    if not isinstance(baseline, dict) or baseline.get("schema") != SCHEMA or not isinstance(baseline.get("points"), list):
        raise ValueError(f'{path}: no stored report (`halfplane report --json`, schema "{SCHEMA}")')
    here, there = document["points"], baseline["points"]
    try:
        for key in ("set", "law", "detector"):
            one, other = here[0]["report"].get(key), there[0]["report"].get(key)
            if one != other:
                raise ValueError(f"{path}: {key} is {other}, but {one} in the report; there is nothing to compare")
        matched = [_compared(point["report"], _nearest(point["report"], there)) for point in here]
    except (KeyError, IndexError, TypeError, AttributeError):
        raise ValueError(f"{path}: the stored report's points are not whole") from None
    document["against"] = {
        "file": Path(path).name,
        "sha256": hashlib.sha256(raw).hexdigest(),
        **({"job": baseline["job"]} if isinstance(baseline.get("job"), str) else {}),
        "points": matched,
    }


def es_n0_db(report: dict) -> tuple[float | None, str]:
    """Es/N0 that a point is named by: at the input where it is known, else as gauged → (dB, "input" or "decision")."""
    given = report.get("input", {}).get("es_n0_db")
    return (given, "input") if given is not None else (report.get("total", {}).get("es_n0_db"), "decision")


def _nearest(report: dict, points: list[dict]) -> dict | None:
    at, place = es_n0_db(report)
    if at is None:
        return None
    best, least = None, SAME_POINT_DB
    for point in points:
        there, of = es_n0_db(point["report"])
        if of == place and there is not None and abs(there - at) <= least:
            best, least = point["report"], abs(there - at)
    return best


def _compared(report: dict, stored: dict | None) -> dict:
    """What the baseline counted at a point, and by how much the shortfall changed since; intervals of independent runs by quadrature."""
    if stored is None:
        return {}
    total = stored["total"]
    out: dict = {"es_n0_db": es_n0_db(stored)[0]}
    out |= {key: total[key] for key in ("ser", "ser_low", "ser_high", "ber", "ber_low", "ber_high", "judged") if key in total}
    changes = {}
    for place in ("decision", "input"):
        now, then = report.get("shortfall", {}).get(place, {}), stored.get("shortfall", {}).get(place, {})
        if "db" not in now or "db" not in then:
            continue
        change = now["db"] - then["db"]
        one = changes[place] = {"db": change}
        if all(end in each for each in (now, then) for end in ("db_low", "db_high")):
            one["db_low"] = change - math.hypot(now["db"] - now["db_low"], then["db_high"] - then["db"])
            one["db_high"] = change + math.hypot(now["db_high"] - now["db"], then["db"] - then["db_low"])
    if changes:
        out["shortfall_change_db"] = changes
    return out
