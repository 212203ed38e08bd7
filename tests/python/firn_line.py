# SPDX-License-Identifier: GPL-3.0-or-later
"""The Firn line from its command: files, reports that add up, a shortfall that shows, sets of other sizes, refusals."""

import json
import os
import subprocess
import sys

import pytest
from command import BUILD, SOURCE


def firn_line(*arguments):
    environment = {**os.environ, "PYTHONPATH": str(BUILD / "python")}
    command = [sys.executable, str(SOURCE / "examples" / "firn_line.py"), *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, env=environment, timeout=300)


@pytest.mark.parametrize("what", [None, "qam:16", "psk:2"])
def test_two_steps(what, tmp_path):
    options = ["--set", what] if what else []
    values = "8..9/1" if what == "psk:2" else "12..14/2"
    done = firn_line("--es-n0", values, "--errors", "200", "--out", tmp_path, *options)
    assert done.returncode == 0, done.stderr
    names = {"points.svg", "points.png", "shortfall.svg", "shortfall.png", "reports.jsonl", "reports.jsonl.carry"}
    assert {path.name for path in tmp_path.iterdir()} == names and all(path.stat().st_size > 500 for path in tmp_path.iterdir())
    lines = [json.loads(line) for line in (tmp_path / "reports.jsonl").read_text().splitlines()]
    assert lines[0]["schema"] == "halfplane/settings/1" and len(lines[0]["settings"]["points"]) > 1
    reports = [line for line in lines if line["schema"] == "halfplane/report/1"]
    for report in reports:
        total = report["total"]
        assert total["in"] == total["judged"] + total["nonfinite"] + total["pending"] + sum(total["excluded"].values())
    total = reports[-1]["total"]
    assert total["judged"] > 390_000
    # The host's timing loop, this wide, slips a few times in a million symbols of two-point sets; that is measured too.
    assert total["slips"] == 0 if what != "psk:2" else total["slips"] < 20
    # The timing loop of this receiver costs a few tenths of a decibel, and that shows at the input.
    assert 0.1 < reports[-1]["shortfall"]["input"]["db"] < 0.8
    assert "step 2 of 2" in done.stdout and "\x1b" not in done.stdout


@pytest.mark.parametrize(
    ("arguments", "says"),
    [(["--set", "qam:17"], "17"), (["--es-n0", "x"], "x"), (["--errors", "0"], "0"), (["--bogus"], "--bogus")],
)
def test_refusals(arguments, says):
    done = firn_line(*arguments)
    assert done.returncode == 2 and done.stderr.count("\n") == 1 and says in done.stderr
