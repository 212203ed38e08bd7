# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane simulate`: schema, seeds, intervals, importance sampling, and Ctrl-C."""

import json
import os
import signal
import subprocess
import time

import pytest
from command import BUILD, FIRN, document, halfplane, refused
from scipy.stats import beta


def test_schema_and_interval():
    run = document("simulate", FIRN, "--es-n0", "8..12/4", "--errors", "100", "--seed", "7")
    assert {"set", "seed", "law", "detector", "symbols_per_second", "rows"} <= set(run)
    assert run["seed"] == 7 and [row["es_n0_db"] for row in run["rows"]] == [8.0, 12.0]
    for row in run["rows"]:
        n, k = row["symbols"], row["symbol_errors"]
        assert k >= 100 and row["ser"] == k / n and row["bits"] == 4 * n and row["ber"] == row["bit_errors"] / row["bits"]
        # Clopper and Pearson (1934) through the beta distribution of SciPy.
        assert row["ser_low"] == pytest.approx(beta.ppf(0.025, k, n - k + 1), rel=1e-9)
        assert row["ser_high"] == pytest.approx(beta.ppf(0.975, k + 1, n - k), rel=1e-9)
        # A right simulator is beyond 4.5 once in 150,000 seeds; this seed is fixed.
        assert abs(row["z"]) < 4.5


def test_the_same_seed_counts_the_same_and_another_does_not():
    rows = [document("simulate", "qam:16", "--es-n0", "12", "--seed", seed)["rows"] for seed in (5, 5, 6)]
    assert rows[0] == rows[1] != rows[2]


def test_no_errors_leave_the_lower_end_open():
    (row,) = document("simulate", "psk:2", "--es-n0", "14", "--max-symbols", "65536")["rows"]
    assert row["symbol_errors"] == 0 and "ser_low" not in row
    assert row["ser_high"] == pytest.approx(1 - 0.05 ** (1 / row["symbols"]), rel=1e-9)


def test_rare_errors():
    run = document("simulate", FIRN, "--es-n0", "22..26/2", "--rare", "--errors", "2000")
    assert run["method"] == "importance sampling"
    for row in run["rows"]:
        assert row["exact"]["ser"] < 1e-9 and "symbol_errors" not in row
        assert row["ser"] == pytest.approx(row["exact"]["ser"], rel=0.15) and abs(row["z"]) < 4.5


def test_ctrl_c_keeps_what_was_counted():
    process = subprocess.Popen(
        [str(BUILD / "halfplane"), "simulate", "qam:16", "--es-n0", "40", "--max-symbols", "1e15", "--json"],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
    )  # fmt: skip
    time.sleep(3)
    os.kill(process.pid, signal.SIGINT)
    out, error = process.communicate(timeout=60)
    assert process.returncode == 130 and "interrupted" in error
    (row,) = json.loads(out)["rows"]
    assert row["symbols"] > 0 and row["symbol_errors"] == 0


def test_table_and_refusals():
    assert "importance sampling" in halfplane("simulate", "psk:8", "--es-n0", "20", "--rare").stdout
    assert "not a whole number" in refused("simulate", FIRN, "--es-n0", "3", "--errors", "0")
    assert "seed" in refused("simulate", FIRN, "--es-n0", "3", "--seed", "-1")
    assert "--es-n0 or --eb-n0" in refused("simulate", FIRN)
