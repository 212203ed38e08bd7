# SPDX-License-Identifier: GPL-3.0-or-later
"""
Injected faults: what the report must and must not say of each.

Every count is compared with an independent one in numpy over the very samples that link_watch was given, and, where
the fault is a fixed distortion, with a plain simulation here that never saw the aligner.
"""

import numpy as np
import pytest
from gnuradio import halfplane
from scipy import stats

from bench import FIRN, assert_account_adds_up, counted, run_link

SYMBOLS = 100000
PATTERN = "draw:3"


def expected_errors(which, es_n0_db, distort, count=400000):
    """SER of nearest-point decisions on distorted points in white noise, simulated here with numpy alone."""
    rng = np.random.default_rng(99)
    points = np.array(which.points)
    sent = rng.integers(len(points), size=count)
    n0 = which.es / 10 ** (es_n0_db / 10)
    noise = np.sqrt(n0 / 2) * (rng.normal(size=count) + 1j * rng.normal(size=count))
    received = distort(points[sent] + noise)
    return np.mean(np.argmin(np.abs(received[:, None] - points), axis=1) != sent)


def assert_rate(report, expected, simulated=400000):
    """The measured SER is the expected one within 99.9 % of what both simulations allow."""
    total = report["total"]
    error = np.sqrt(expected * (1 - expected) * (1 / total["judged"] + 1 / simulated))
    off = (total["ser"] - expected) / error
    print(f"SER {total['ser']:.5f}, {expected:.5f} expected, off by {off:.2f} standard errors")
    assert abs(off) < stats.norm.ppf(0.9995)


def assert_counted_in_full(which, report, samples, reference, symbols=SYMBOLS):
    """Judged symbols, symbol and bit errors agree with numpy to the last one, and the account adds up."""
    total = report["total"]
    assert (total["judged"], total["symbol_errors"], total["bit_errors"]) == counted(which, samples, reference)
    assert_account_adds_up(report, symbols)


NOT_A_CAUSE = {"excess_noise", "interaction", "unexplained"}


def costs(report):
    """Cost in dB of each row of the losses, whose sum is the shortfall at the input."""
    rows = {row["cause"]: row["cost_db"] for row in report["losses"]}
    assert len(rows) == len(report["losses"])
    assert abs(sum(rows.values()) - report["shortfall"]["input"]["db"]) < 1e-6
    return rows


def assert_explained(report, causes, premises, rest=0.1):
    """These causes and failing premises and no others; `unexplained` within what the count allows, or `rest` of it all."""
    rows = costs(report)
    shortfall = report["shortfall"]["input"]
    print({cause: round(cost, 3) for cause, cost in rows.items()}, "of", round(shortfall["db"], 3), "dB")
    assert {cause for cause in rows.keys() - NOT_A_CAUSE if abs(rows[cause]) >= 0.03} == set(causes)
    assert [p["name"] for p in report["premises"] if p["state"] == "fails"] == list(premises)
    assert report["shortfall"]["decision"].get("doubted_by", []) == list(premises)
    assert abs(rows["unexplained"]) < max(rest * abs(shortfall["db"]), (shortfall["db_high"] - shortfall["db_low"]) / 2)


def iq_imbalance(samples, db=0.5):
    """Gain of I against Q of `db`, shared between the two."""
    g = 10 ** (db / 40)
    return samples.real * g + 1j * samples.imag / g


# name, distortion that stands for the whole run, Es/N0, the cause and the premises that must be named: the aligner
# must not hide it (correction off)
STANDING = {
    "phase error of 8 degrees": (lambda s: s * np.exp(1j * np.radians(8)), 14.0, "phase_error", []),
    "gain of 0.7": (lambda s: 0.7 * s, 14.0, "gain_error", []),
    "I/Q imbalance of 0.5 dB": (iq_imbalance, 14.0, "iq_imbalance", ["no_image"]),
}


@pytest.mark.parametrize("name", STANDING)
def test_standing_faults_cost_errors(name):
    which = halfplane.load_set(FIRN)
    distort, es_n0_db, cause, premises = STANDING[name]
    report, samples, reference = run_link(
        which, es_n0_db, SYMBOLS, pattern=PATTERN, correction="off", fault=lambda s, k: distort(s).astype(np.complex64))
    assert_counted_in_full(which, report, samples, reference)
    expected = expected_errors(which, es_n0_db, distort)
    assert_rate(report, expected)
    clean = halfplane.predictor(which).ser(es_n0_db)
    assert report["total"]["ser"] > clean if name != "I/Q imbalance of 0.5 dB" else report["total"]["ser"] > 0.9 * clean
    assert report["total"]["slips"] == 0
    assert_explained(report, [cause], premises)
    excluded = report["total"]["excluded"]
    assert excluded["slip"] == excluded["signal_lost"] == excluded["overflow"] == 0


def test_standing_phase_and_gain_are_gauged():
    """What the points are turned by stands in the report, not only its cost."""
    which = halfplane.load_set(FIRN)
    total = run_link(which, 20.0, SYMBOLS, pattern=PATTERN, correction="off",
                     fault=lambda s, k: s * np.complex64(0.7 * np.exp(1j * np.radians(8))))[0]["total"]
    assert abs(total["phase_deg"] - 8) < 0.2
    assert abs(total["gain_db"] - 20 * np.log10(0.7)) < 0.05
    assert abs(total["es_n0_db"] - 20) < 4 * total["es_n0_db_se"]  # signal and noise shrink alike


def test_running_correction_takes_gain_and_phase_out():
    which = halfplane.load_set(FIRN)
    report, samples, reference = run_link(which, 14.0, SYMBOLS, pattern=PATTERN,
                                          fault=lambda s, k: s * np.complex64(0.7 * np.exp(1j * np.radians(8))))
    assert_counted_in_full(which, report, samples, reference)
    # memory 2000: the estimate's own noise costs less than 0.01 dB, far inside the interval
    assert_rate(report, halfplane.predictor(which).ser(14.0), simulated=1e12)
    assert_explained(report, [], [])


class echo:
    """An echo `db` below the signal, one symbol late."""

    def __init__(self, db):
        self.gain, self.last = 10 ** (db / 20), 0

    def __call__(self, samples, _):
        late = np.concatenate([[self.last], samples[:-1]])
        self.last = samples[-1]
        return (samples + self.gain * late).astype(np.complex64)


def test_echo():
    which = halfplane.load_set(FIRN)
    es_n0_db = 17.0
    report, samples, reference = run_link(which, es_n0_db, SYMBOLS, pattern=PATTERN, fault=echo(-20))
    assert_counted_in_full(which, report, samples, reference)
    clean = halfplane.predictor(which).ser(es_n0_db)
    total = report["total"]
    assert total["ser_low"] > clean
    # The gauge sees noise and echo: 1/γ + 0.01 (the echo's noise adds a hundredth of the noise).
    seen = -10 * np.log10(1.01 * 10 ** (-es_n0_db / 10) + 0.01)
    assert abs(total["es_n0_db"] - seen) < 0.1
    assert report["shortfall"]["input"]["db_low"] > 0
    # The echo's own noise colours the noise by 1 %: 0.04 dB.
    rows = costs(report)
    assert 0 <= rows.pop("coloured_noise", 0) < 0.06
    report["losses"] = [row for row in report["losses"] if row["cause"] != "coloured_noise"]
    report["shortfall"]["input"]["db"] = sum(rows.values())
    assert_explained(report, ["echo"], ["no_memory"])


def test_phase_noise():
    """3 degrees rms on top of 17 dB: named, and worth what a plain simulation says it costs."""
    which = halfplane.load_set(FIRN)
    es_n0_db, rng = 17.0, np.random.default_rng(8)

    def jitter(samples, _=None):
        return (samples * np.exp(1j * np.radians(3) * rng.normal(size=len(samples)))).astype(np.complex64)

    report, samples, reference = run_link(which, es_n0_db, SYMBOLS, pattern=PATTERN, fault=jitter)
    assert_counted_in_full(which, report, samples, reference)
    assert_explained(report, ["phase_noise"], ["circular"])
    exact = halfplane.predictor(which)
    simulated = expected_errors(which, es_n0_db, jitter)
    worth = es_n0_db - float(exact.es_n0_db_for_ser(simulated))
    assert abs(costs(report)["phase_noise"] - worth) < 0.1


def test_fading_is_a_premise_that_fails():
    """A gain that swings by 2 dB to either side, slower than the aligner follows: the report says what does not hold."""
    which = halfplane.load_set(FIRN)
    report, samples, reference = run_link(
        which, 20.0, SYMBOLS, pattern=PATTERN, correction="held",
        fault=lambda s, k: (s * 10 ** (np.sin(k / 3000) / 10)).astype(np.complex64))
    assert_counted_in_full(which, report, samples, reference)
    premises = {p["name"]: p for p in report["premises"]}
    assert premises["steady_gain"]["state"] == "fails" and premises["steady_gain"]["effect_db"] > 1
    assert premises["no_memory"]["state"] == premises["no_image"]["state"] == "holds"
    decision = report["shortfall"]["decision"]
    print("shortfall at the decision", decision)
    assert "steady_gain" in decision["doubted_by"]


def test_bursts():
    """200 symbols of strong noise every 5000: errors appear in full, none is dropped as a loss of lock."""
    which = halfplane.load_set(FIRN)
    rng = np.random.default_rng(4)

    def burst(samples, k):
        noise = rng.normal(size=len(k)) + 1j * rng.normal(size=len(k))
        return np.where((k > 20000) & (k % 5000 < 200), samples + 3 * noise, samples).astype(np.complex64)

    report, samples, reference = run_link(which, 22.0, SYMBOLS, pattern=PATTERN, fault=burst)
    assert_counted_in_full(which, report, samples, reference)
    total = report["total"]
    k = np.arange(len(reference))
    hit = (k > 20000) & (k % 5000 < 200)
    assert np.all(reference[hit] >= 0), "symbols of a burst were left out"
    assert total["slips"] == 0 and total["excluded"]["signal_lost"] == 0
    # Three quarters of decisions at random among twelve points, or more, are wrong in a burst.
    assert total["symbol_errors"] > 0.5 * np.sum(hit)
    assert total["dispersion"] > 5  # errors cluster, and the interval is wider for it
    binomial = stats.beta.ppf(0.975, total["symbol_errors"] + 1, total["judged"] - total["symbol_errors"])
    assert total["ser_high"] - total["ser"] > 1.5 * (binomial - total["ser"])
    # What the curve of steady noise says of bursts is wrong, and the report says so.
    assert [p["name"] for p in report["premises"] if p["state"] == "fails"] == ["gaussian", "steady_noise"]
    assert max(costs(report), key=costs(report).get) == "excess_noise"


def test_zeroed_samples():
    """500 zeroed samples: all are judged, since the delay did not change."""
    which = halfplane.load_set(FIRN)
    gap = (40000, 40500)
    report, samples, reference = run_link(
        which, 20.0, SYMBOLS, pattern=PATTERN,
        fault=lambda s, k: np.where((k >= gap[0]) & (k < gap[1]), 0, s).astype(np.complex64))
    assert_counted_in_full(which, report, samples, reference)
    total = report["total"]
    assert np.all(reference[gap[0]:gap[1]] >= 0), "symbols of the gap were left out"
    assert total["slips"] == 0 and total["excluded"]["signal_lost"] == 0
    assert 0.5 * 500 < total["symbol_errors"]
    assert "steady_noise" in [p["name"] for p in report["premises"] if p["state"] == "fails"]


def test_nonfinite_samples_are_counted():
    which = halfplane.load_set(FIRN)
    report, samples, reference = run_link(
        which, 20.0, SYMBOLS, pattern=PATTERN,
        fault=lambda s, k: np.where((k > 30000) & (k % 1000 == 7), np.nan, s).astype(np.complex64))
    assert_counted_in_full(which, report, samples, reference)
    assert report["total"]["nonfinite"] == np.sum(~np.isfinite(samples) & (reference >= 0)) > 60


# Nothing to lock to: what arrives carries no pattern, or another.
NO_PATTERN = {
    "muted input": dict(fault=lambda s, k: np.zeros_like(s)),
    "unmodulated carrier": dict(fault=lambda s, k: np.full_like(s, 1 + 1j)),
    "wrong pattern": dict(expected="draw:4"),
}


@pytest.mark.parametrize("which, pattern", [(FIRN, PATTERN), ("psk:4", "o150:9"), ("qam:16", "o150:15")])
@pytest.mark.parametrize("name", NO_PATTERN)
def test_nothing_locks(name, which, pattern):
    which = halfplane.load_set(which)
    how = dict(NO_PATTERN[name])
    if "expected" in how and pattern.startswith("o150"):
        how["expected"] = "o150:11"
    report, _, reference = run_link(which, 20.0, SYMBOLS, pattern=pattern, **how)
    total = report["total"]
    assert total["judged"] == 0 and total.get("symbol_errors", 0) == 0
    assert np.all(reference == -1)
    assert "ser" not in total and "shortfall" not in report and "losses" not in report and "premises" not in report
    assert_account_adds_up(report, SYMBOLS)
    assert total["excluded"]["before_lock"] == SYMBOLS
    assert report.get("lock", {"state": "searching"})["state"] == "searching"
