# SPDX-License-Identifier: GPL-3.0-or-later
"""Reports with made-up counts, in the schema of link_watch, to feed the plots and the terminal view."""

import math


def step(es_n0_db, errors=400):
    """A step whose link falls 0.25 dB short; its exact rate is an exponential that merely looks like one."""
    exact = 0.5 * math.exp(-(10 ** (es_n0_db / 10)) / 7.5)
    ser = 0.5 * math.exp(-(10 ** ((es_n0_db - 0.25) / 10)) / 7.5)
    judged = round(errors / ser)
    width = 2 / math.sqrt(errors)
    bits = 4 * judged
    ber = ser * 0.4
    rungs = {"exact": 1.0, "facing": 1.02, "union": 1.1, "nearest": 0.7}
    return {
        "schema": "halfplane/report/1",
        "set": "firn-12",
        "pattern": "draw:2026",
        "law": "awgn",
        "total": {
            "in": judged + 5000, "judged": judged, "pending": 4096, "nonfinite": 0,
            "excluded": {"before_lock": 904, "slip": 0, "signal_lost": 0, "overflow": 0},
            "symbols": judged, "symbol_errors": errors, "bits": bits, "bit_errors": round(bits * ber),
            "ser": ser, "ser_low": ser * (1 - width), "ser_high": ser * (1 + width),
            "ber": ber, "ber_low": ber * (1 - width), "ber_high": ber * (1 + width),
            "es_n0_db": es_n0_db - 0.25, "es_n0_db_se": 0.01, "gain_db": -0.01, "phase_deg": 0.02, "evm_rms": 0.25,
            "predicted": {rung: {"ser": f * exact, "ber": f * exact * 0.4} for rung, f in rungs.items()},
        },
        "input": {"es_n0_db": es_n0_db, "es_n0_db_se": 0.0, "source": "declared"},
        "shortfall": {
            "decision": {"db": 0.01, "db_low": -0.05, "db_high": 0.07},
            "input": {"db": 0.25, "db_low": 0.18, "db_high": 0.33},
        },
        "lock": {"state": "held", "delay": 1234, "rotation_deg": 90.0, "mirrored": False, "inverted": False},
    }  # fmt: skip


def steps():
    return [step(es_n0_db) for es_n0_db in (8.0, 10.0, 12.0, 14.0, 16.0, 18.0)]


def silent():
    """A step that counted no error: only upper ends, and no shortfall."""
    report = step(12.0)
    total = report["total"]
    total.update(symbol_errors=0, bit_errors=0, ser=0.0, ber=0.0, ser_high=3e-4, ber_high=3e-4)
    del total["ser_low"], total["ber_low"], report["shortfall"]
    return report


def searching():
    """A step whose pattern was not found: nothing judged, nothing gauged."""
    return {
        "set": "firn-12", "pattern": "draw:2026", "law": "awgn",
        "total": {
            "in": 20000, "judged": 0, "pending": 4096, "nonfinite": 0, "symbols": 0, "symbol_errors": 0, "bits": 0,
            "bit_errors": 0, "excluded": {"before_lock": 15904, "slip": 0, "signal_lost": 0, "overflow": 0},
        },
        "input": {"es_n0_db": 3.0, "source": "declared"},
        "lock": {"state": "searching"},
    }  # fmt: skip


def full():
    """A step with everything that a report may say."""
    report = step(12.0)
    total = report["total"]
    total["excluded"].update(slip=500, signal_lost=1000, overflow=20_000)
    total["nonfinite"] = 3
    total["in"] += 21_503
    total["slips"] = 1
    total.update(
        frames=400, frame_errors=12, fer=0.03, fer_low=0.0156, fer_high=0.0518,
        frames_excluded={"before_lock": 1, "slip": 1, "signal_lost": 2, "overflow": 20, "nonfinite": 1},
    )  # fmt: skip
    report.update(
        losses=[
            {"cause": "echo", "power_db": -28.0, "cost_db": 0.08}, {"cause": "phase_noise", "power_db": -31.0, "cost_db": 0.06},
            {"cause": "iq_imbalance", "power_db": -40.0, "cost_db": 0.04}, {"cause": "interaction", "cost_db": -0.01},
            {"cause": "unexplained", "cost_db": 0.08},
        ],
        premises=[
            {"name": "white", "p": 1e-9, "effect_db": 0.12, "state": "fails"},
            {"name": "circular", "p": 0.3, "effect_db": 0.0, "state": "holds"},
            {"name": "gaussian", "state": "too_few"},
        ],
        verdict={
            "target": {"ser": 1e-3}, "state": "undecided", "log_wealth_pass": 1.2, "log_wealth_fail": -3.0, "symbols_to_go": 1_234_567,
            "excluded_share": 0.002,
        },
        seconds={"errored": 12, "severely_errored": 1, "unavailable": 0, "available": 400},
    )  # fmt: skip
    return report


def live():
    """Live traffic alone: nothing counted, the gauge blind."""
    report = searching()
    del report["lock"], report["pattern"]
    total = report["total"]
    total.update(live=15_904, excluded={"before_lock": 0, "slip": 0, "signal_lost": 0, "overflow": 0})
    total["live_part"] = {
        "symbols": 15_904, "gauged": 15_904, "sampled": 15_904, "es_n0_db": 14.48, "es_n0_db_se": 0.029,
        "predicted": {rung: {"ser": f * 7.1e-3, "ber": f * 1.9e-3} for rung, f in {"exact": 1.0, "facing": 1.02, "union": 1.1, "nearest": 0.7}.items()},
    }  # fmt: skip
    return report


def partly():
    """Preambles known in advance, some frames known by decoding, the rest live."""
    report = step(12.0)
    del report["lock"]
    total = report["total"]
    total.update(decoded=50_279, live=86_708, live_part={**live()["total"]["live_part"], "symbols": 86_708})
    total["in"] += 50_279 + 86_708
    total["decoded_part"] = {
        "symbols": 50_279, "symbol_errors": 3, "ser": 3 / 50_279, "ser_low": 1.2e-5, "ser_high": 1.7e-4, "es_n0_db": 12.31, "es_n0_db_se": 0.02,
    }  # fmt: skip
    return report
