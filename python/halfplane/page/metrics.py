# SPDX-License-Identifier: GPL-3.0-or-later
"""The latest report as OpenMetrics text. What the report does not know has no sample."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator

from prometheus_client import CollectorRegistry
from prometheus_client.core import CounterMetricFamily, GaugeMetricFamily, InfoMetricFamily, StateSetMetricFamily
from prometheus_client.metrics_core import Metric
from prometheus_client.openmetrics.exposition import CONTENT_TYPE_LATEST, generate_latest

CONTENT_TYPE = CONTENT_TYPE_LATEST

LOCK_STATES = ("searching", "held", "doubtful", "lost")
VERDICTS = ("pass", "fail", "undecided")
_RUNGS = ("exact", "facing", "union", "nearest")
_PARTS = {"run": "total", "window": "window"}
_UNJUDGED = {"decoded": "decoded_part", "live": "live_part"}  # parts of the run whose symbols were not known in advance

# Counters of the whole run: name, place in the report's `total` (or `seconds`), help.
_OF_TOTAL = (
    ("halfplane_symbols_in", "in", "Symbols taken in."),
    ("halfplane_symbols_judged", "judged", "Symbols judged right or wrong."),
    ("halfplane_symbols_nonfinite", "nonfinite", "Symbols left out because the sample was not a finite number."),
    ("halfplane_symbols_decoded", "decoded", "Symbols known by decoding alone, counted apart."),
    ("halfplane_symbols_live", "live", "Symbols of live traffic, which nobody can judge."),
    ("halfplane_symbol_errors", "symbol_errors", "Symbols decided wrong."),
    ("halfplane_bits", "bits", "Label bits of the symbols judged."),
    ("halfplane_bit_errors", "bit_errors", "Label bits decided wrong."),
    ("halfplane_slips", "slips", "Times that the pattern was found again at another delay."),
)
_OF_SECONDS = (
    ("halfplane_errored_seconds", "errored", "Errored seconds, by analogy with ITU-T G.821."),
    ("halfplane_severely_errored_seconds", "severely_errored", "Severely errored seconds."),
    ("halfplane_unavailable_seconds", "unavailable", "Unavailable seconds."),
)
# Gauges of the run and of the latest window: name, unit, key, help.
_OF_PARTS = (
    ("halfplane_es_n0", "decibels", "es_n0_db", "Es/N0 gauged from the received points."),
    ("halfplane_es_n0_standard_error", "decibels", "es_n0_db_se", "Standard error of halfplane_es_n0."),
    ("halfplane_modulation_error", "decibels", "mer_db", "Modulation error ratio, after ETSI TR 101 290."),
    ("halfplane_gain", "decibels", "gain_db", "Gain of the received points against the set's."),
    ("halfplane_evm", "ratio", "evm_rms", "Error vector magnitude, RMS."),
)


class Collector:
    """
    Reads what `state` gives: the latest report ({} before the first) and the number of reports so far. One registry of its
    own, so that other exporters of the process keep theirs.
    """

    def __init__(self, state: Callable[[], tuple[dict, int]], clients: Callable[[], int] = lambda: 0):
        self._state, self._clients = state, clients
        self._seen = (0, time.monotonic())
        self._registry = CollectorRegistry(auto_describe=False)
        self._registry.register(self)

    def text(self) -> bytes:
        return generate_latest(self._registry)

    def reported(self, number: int) -> None:
        """A report came just now, the so-manieth: what its age is counted from."""
        self._seen = (number, time.monotonic())

    def collect(self) -> Iterator[Metric]:
        report, reports = self._state()
        yield CounterMetricFamily("halfplane_reports", "Reports received by the page.", value=reports)
        yield _gauge("halfplane_page_clients", "", "Live pages open.", [({}, self._clients())])
        if not reports:
            return
        yield _gauge("halfplane_report_age", "seconds", "Time since the latest report.", [({}, time.monotonic() - self._seen[1])])
        named = {key: str(report[key]) for key in ("set", "pattern", "law", "detector", "decisions", "version", "settings_sha256") if key in report}
        yield InfoMetricFamily("halfplane_link", "What is measured, and how.", value=named)
        yield from _counters(report)
        yield from _gauges(report)
        yield from _judgements(report)


def _counters(report: dict) -> Iterator[Metric]:
    total, seconds = report.get("total", {}), report.get("seconds", {})
    for table, values in ((_OF_TOTAL, total), (_OF_SECONDS, seconds)):
        for name, key, help_text in table:
            if key in values:
                yield CounterMetricFamily(name, help_text, value=values[key])
    if "excluded" in total:
        family = CounterMetricFamily("halfplane_symbols_excluded", "Symbols left out, by cause.", labels=["cause"])
        for cause, number in total["excluded"].items():
            family.add_metric([cause], number)
        yield family
    if "pending" in total:
        yield _gauge("halfplane_symbols_pending", "", "Symbols taken in and not yet judged.", [({}, total["pending"])])


def _gauges(report: dict) -> Iterator[Metric]:
    parts = {part: report[place] for part, place in _PARTS.items() if place in report}
    parts |= {part: report["total"][place] for part, place in _UNJUDGED.items() if place in report.get("total", {})}
    for name, unit, key, help_text in _OF_PARTS:
        yield from _known(name, unit, help_text, [({"part": part}, values.get(key)) for part, values in parts.items()])
    for end, help_text in (("", "Errors counted a symbol (ser) or bit (ber)."), ("_low", "Low end of its interval."), ("_high", "High end of its interval.")):
        samples = [({"kind": kind, "part": part}, values.get(kind + end)) for part, values in parts.items() for kind in ("ser", "ber")]
        yield from _known(f"halfplane_error_rate{end}", "ratio", help_text, samples)
    samples = [
        ({"kind": kind, "part": part, "rung": rung}, values.get("predicted", {}).get(rung, {}).get(kind))
        for part, values in parts.items() for kind in ("ser", "ber") for rung in _RUNGS
    ]  # fmt: skip
    yield from _known("halfplane_predicted_error_rate", "ratio", "Error rate predicted at the gauged Es/N0.", samples)
    yield from _known("halfplane_input_es_n0", "decibels", "Es/N0 ahead of the receiver.", [({}, report.get("input", {}).get("es_n0_db"))])
    places = report.get("shortfall", {})
    for end, help_text in (("", "Decibels missing against the exact curve."), ("_low", "Low end of its interval."), ("_high", "High end of its interval.")):
        samples = [({"place": place}, values.get("db" + end)) for place, values in places.items()]
        yield from _known(f"halfplane_shortfall{end}", "decibels", help_text, samples)
    samples = [({"cause": each["cause"]}, each.get("cost_db")) for each in report.get("losses", ()) if "cause" in each]
    yield from _known("halfplane_loss", "decibels", "Decibels lost, by cause.", samples)
    yield from _known("halfplane_symbols_to_go", "", "Symbols until a verdict, the median at the present estimate.", [({}, report.get("verdict", {}).get("symbols_to_go"))])


def _judgements(report: dict) -> Iterator[Metric]:
    for name, states, now, help_text in (
        ("halfplane_lock", LOCK_STATES, report.get("lock", {}).get("state"), "State of the lock to the pattern."),
        ("halfplane_verdict", VERDICTS, report.get("verdict", {}).get("state"), "Verdict on the target."),
    ):
        if now is not None:
            yield StateSetMetricFamily(name, help_text, value={state: state == now for state in states})
    failing = [({"premise": each["name"]}, int(each.get("state") == "fails")) for each in report.get("premises", ()) if "name" in each]
    yield from _known("halfplane_premise_fails", "", "1 where what the predictions take for granted does not hold.", failing)


def _known(name: str, unit: str, help_text: str, samples) -> Iterator[Metric]:
    """The gauge with those samples that have a value; nothing where none has."""
    known = [(labels, value) for labels, value in samples if value is not None]
    if known:
        yield _gauge(name, unit, help_text, known)


def _gauge(name: str, unit: str, help_text: str, samples) -> GaugeMetricFamily:
    family = GaugeMetricFamily(f"{name}_{unit}" if unit else name, help_text, labels=list(samples[0][0]), unit=unit)
    for labels, value in samples:
        family.add_metric(list(labels.values()), value)
    return family
