# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane simulate`: schema, seeds, intervals, importance sampling, and Ctrl-C."""

import fcntl
import json
import os
import pty
import re
import select
import signal
import struct
import subprocess
import termios
import time

import pytest
from command import BUILD, FIRN, document, halfplane, refused
from scipy.stats import beta, norm


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


def test_width_of_the_interval_stops_it():
    (row,) = document("simulate", "qam:16", "--es-n0", "14", "--width", "0.05")["rows"]
    relative = (row["ser_high"] - row["ser_low"]) / row["ser"]
    # The width goes with the root of the count and a run is 65,536 symbols: not narrower than one run fewer would leave it.
    assert 0.05 * (1 - 65536 / row["symbols"]) ** 0.5 * 0.98 < relative < 0.05


def test_displaced_points_against_the_exact_rate_and_in_closed_form():
    moved = ["--rotation", "-5", "--gain-imbalance", "0.8", "--phase-imbalance", "3", "--offset", "0.05-0.02j", "--saturation", "3"]
    run = document("simulate", "qam:16", "--es-n0", "14", "--errors", "20000", *moved)
    (row,) = run["rows"]
    (plain,) = document("simulate", "qam:16", "--es-n0", "14", "--errors", "20000")["rows"]
    assert abs(row["z"]) < 4.5 and len(run["means"]) == 16
    assert row["exact"]["ser"] > 1.2 * plain["exact"]["ser"]
    assert row["union"] == plain["union"]  # knows nothing of the displacement
    # Two points at +-1 and an offset d along their line: SER = [Q((1 + d) sqrt(2/N0)) + Q((1 - d) sqrt(2/N0))] / 2.
    (two,) = document("simulate", "psk:2", "--es-n0", "6", "--errors", "20000", "--offset", "0.3")["rows"]
    scale = (2 * 10**0.6) ** 0.5
    assert two["exact"]["ser"] == pytest.approx((norm.sf(1.3 * scale) + norm.sf(0.7 * scale)) / 2, rel=1e-12)
    assert abs(two["z"]) < 4.5


@pytest.mark.parametrize("es_n0_db", [15, 17, 19, 20, 21, 22, 23, 24, 24.8, 25.4])
def test_rare_errors_of_qam_16_in_closed_form(es_n0_db):
    """From 1e-3 to 1e-15 within 4.5 of its own standard errors, and these are what was asked for (5 %: 400 'errors')."""
    (row,) = document("simulate", "qam:16", "--es-n0", str(es_n0_db), "--rare", "--errors", "400")["rows"]
    q = norm.sf((10 ** (es_n0_db / 10) / 5) ** 0.5)  # half the spacing over sigma; SER = 3 q - 9/4 q^2
    exact = 3 * q - 2.25 * q * q
    assert abs(row["ser"] - exact) < 4.5 * row["ser_se"] and row["ser_se"] < 0.07 * exact


def test_plot(tmp_path):
    halfplane("simulate", "qam:16", "--es-n0", "10..14/2", "--rotation", "2", "--plot", tmp_path / "rates.svg")
    assert "<svg" in (tmp_path / "rates.svg").read_text()
    assert ".svg, .png" in refused("simulate", "qam:16", "--es-n0", "10", "--plot", tmp_path / "rates.xyz")


def test_table_and_refusals():
    assert "importance sampling" in halfplane("simulate", "psk:8", "--es-n0", "20", "--rare").stdout
    assert "not a whole number" in refused("simulate", FIRN, "--es-n0", "3", "--errors", "0")
    assert "seed" in refused("simulate", FIRN, "--es-n0", "3", "--seed", "-1")
    assert "saturation must be" in refused("simulate", FIRN, "--es-n0", "3", "--saturation", "-1")
    assert "--width does not go with --rare" in refused("simulate", FIRN, "--es-n0", "3", "--rare", "--width", "0.1")
    assert "--es-n0 or --eb-n0" in refused("simulate", FIRN)


def on_a_terminal(*arguments, columns=80, interrupt_after=None):
    """(what a terminal of that width was sent, escape sequences taken out; exit code)."""
    child, terminal = pty.fork()
    if child == 0:
        os.environ.pop("COLUMNS", None)
        os.environ["TERM"] = "xterm"
        fcntl.ioctl(1, termios.TIOCSWINSZ, struct.pack("HHHH", 40, columns, 0, 0))
        os.execv(BUILD / "halfplane", ["halfplane", *arguments])
    sent, end = b"", None if interrupt_after is None else time.monotonic() + interrupt_after
    while True:
        try:
            if select.select([terminal], [], [], 0.1)[0]:
                sent += os.read(terminal, 65536)
        except OSError:  # the other end is closed
            break
        if end is not None and time.monotonic() > end:
            os.kill(child, signal.SIGINT)
            end = None
    os.close(terminal)
    return re.sub(r"\x1b\[[0-9;?]*[A-Za-z]", "", sent.decode()), os.waitstatus_to_exitcode(os.waitpid(child, 0)[1])


def test_progress_on_a_terminal():
    shown, code = on_a_terminal("simulate", "qam:16", "--es-n0", "40", "--max-symbols", "2e12", "--errors", "10", interrupt_after=4)
    assert code == 130
    assert re.search(r"40\.00 dB ━+", shown)  # which Es/N0, and a bar
    assert re.search(r"\d %\s+\d+:\d\d:\d\d", shown)  # its share, and the estimated end
    # What was counted until Ctrl-C stands in the table.
    row = next(line for line in shown.splitlines() if line.strip().startswith("40.00") and "━" not in line)
    assert int(re.search(r"\d{1,3}(\u202f\d{3})+", row)[0].replace("\u202f", "")) > 1_000_000


@pytest.mark.parametrize("columns", [80, 100, 160])
def test_no_figure_is_cut_on_a_terminal(columns):
    shown, code = on_a_terminal("simulate", "qam:16", "--es-n0", "12..14/2", "--errors", "5000", columns=columns)
    rows = [line for line in shown.splitlines() if re.match(r"\s+1[24]\.00 ", line) and "━" not in line]
    assert code == 0 and len(rows) >= 4
    for row in rows:
        assert len(row) <= columns and not re.search(r"\S…|…\S", row), row
    text = " ".join(rows)
    (first, _) = document("simulate", "qam:16", "--es-n0", "12..14/2", "--errors", "5000")["rows"]
    for value in (first["ser"], first["ser_low"], first["ser_high"], first["exact"]["ser"], first["ber"], first["exact"]["ber"]):
        assert f"{value:.3e}" in text
