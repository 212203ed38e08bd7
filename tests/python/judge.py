# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane judge` and `describe` on recordings made here with numpy: verdicts, formats, captures, faults, refusals."""

import hashlib
import json
import math
import os
import signal
import subprocess

import numpy as np
import pytest
from command import BUILD, FIRN, halfplane, refused
from gnuradio import halfplane as hp
from gnuradio.halfplane import recordings

SET = hp.load_set(FIRN)
PATTERN = "draw:7"
SENT = hp.pattern(PATTERN, SET)
UNLOCKED = 2048  # symbols that the search takes at most, for a clean start


def link(symbols, es_n0_db, seed=1, first=0, turn=0.7):
    """Symbols of the pattern through gain, phase and noise of numpy's own."""
    random = np.random.default_rng(seed)
    clean = SET.points[SENT.indices(first, symbols).astype(int)]
    deviation = math.sqrt(SET.es * 10 ** (-es_n0_db / 10) / 2)
    noise = deviation * (random.standard_normal(symbols) + 1j * random.standard_normal(symbols))
    return ((clean + noise) * 0.12 * np.exp(1j * turn)).astype(np.complex64)


def encoded(samples, datatype):
    if datatype.startswith("cf32"):
        return samples.astype("<c8" if datatype.endswith("le") else ">c8").tobytes()
    pairs = np.stack([samples.real, samples.imag], axis=-1).ravel()
    if datatype.startswith("ci16"):
        return np.round(pairs * 32768).astype("<i2" if datatype.endswith("le") else ">i2").tobytes()
    if datatype == "ci8":
        return np.round(pairs * 128).astype("i1").tobytes()
    return (np.round(pairs * 128) + 128).astype("u1").tobytes()


def sigmf(folder, samples, datatype="cf32_le", captures=None, **fields):
    """Metadata written here by hand, not by the writer under test."""
    (folder / "a.sigmf-data").write_bytes(encoded(samples, datatype))
    about = {"core:datatype": datatype, "core:version": "1.0.0", "core:sample_rate": 10000.0}
    about |= {name.replace("_", ":", 1): value for name, value in fields.items()}
    path = folder / "a.sigmf-meta"
    path.write_text(json.dumps({"global": about, "captures": captures or [{"core:sample_start": 0}], "annotations": []}))
    return path


def judge(path, *arguments, target=("--ser", "0.03")):
    done = halfplane("judge", path, "--set", FIRN, "--pattern", PATTERN, *target, *arguments, "--json")
    assert done.returncode != 2, done.stderr
    return json.loads(done.stdout), done


def account_holds(total):
    return total["in"] == total["judged"] + total["nonfinite"] + total["pending"] + sum(total["excluded"].values())


@pytest.mark.parametrize(("ser", "state", "code"), [("0.03", "pass", 0), ("0.003", "fail", 1), ("0.0112", "undecided", 3)])
def test_verdict_is_the_exit_code(tmp_path, ser, state, code):
    """At 14 dB the exact SER of the set is 0.0110 (README)."""
    path = sigmf(tmp_path, link(100000, 14))
    report, done = judge(path, target=("--ser", ser))
    assert (report["verdict"]["state"], done.returncode, done.stderr) == (state, code, "")
    total = report["total"]
    assert total["in"] == 100000 and total["pending"] == 0 and account_holds(total) and report["final"]
    assert total["excluded"]["before_lock"] <= UNLOCKED
    deviation = math.sqrt(0.01102 * total["judged"])
    assert abs(total["symbol_errors"] - 0.01102 * total["judged"]) < 5 * deviation
    assert report["settings"]["target"] and report["recording"]["samples"] == 100000
    text = halfplane("judge", path, "--set", FIRN, "--pattern", PATTERN, "--ser", ser)
    assert text.returncode == code and "firn-12" in text.stdout and f"{total['symbol_errors']:,}".replace(",", "\u202f") in text.stdout


def test_bits_and_frames(tmp_path):
    path = sigmf(tmp_path, link(100000, 14))
    report, done = judge(path, target=("--ber", "0.02"))
    assert done.returncode == 0 and report["verdict"]["target"] == {"ber": 0.02}
    # Frames of 10 symbols: 1 − (1 − 0.01102)^10 is 0.105.
    report, done = judge(path, target=("--fer", "0.2", "--frame", "10"))
    assert done.returncode == 0 and abs(report["total"]["fer"] - 0.105) < 0.02


def test_wrong_pattern_is_undecided_and_said(tmp_path):
    path = sigmf(tmp_path, link(30000, 14))
    done = halfplane("judge", path, "--set", FIRN, "--pattern", "draw:8", "--ser", "0.03", "--json")
    report = json.loads(done.stdout)
    assert done.returncode == 3 and report["total"]["judged"] == 0 and report["total"]["excluded"]["before_lock"] == 30000
    assert done.stderr == "halfplane judge: no lock: the pattern draw:8 was not found in 30000 symbols, so nothing was judged\n"


@pytest.mark.parametrize("symbols", [3000, 4096])
def test_shorter_than_the_holdback(tmp_path, symbols):
    report, _ = judge(sigmf(tmp_path, link(symbols, 20)))
    assert report["total"]["judged"] >= symbols - UNLOCKED and account_holds(report["total"])


def test_symbols_that_are_no_numbers(tmp_path):
    samples = link(50000, 20)
    samples[20000:20100] = np.nan
    samples[30000] = complex(np.inf, 0)
    report, _ = judge(sigmf(tmp_path, samples))
    total = report["total"]
    assert total["nonfinite"] == 101 and account_holds(total) and total["symbol_errors"] < 50


def test_every_format_counts_the_same(tmp_path):
    """At full scale 0.12·1.3 a step of ci8 is 1/20 of the points' distance or less: counts within 3 % of cf32's, the others equal."""
    samples = link(100000, 14)
    counts = {}
    for datatype in hp.sample_formats():
        report, _ = judge(sigmf(tmp_path, samples * (1 if datatype.startswith("cf") else 1.5), datatype))
        counts[datatype] = report["total"]["symbol_errors"]
    wanted = counts["cf32_le"]
    assert wanted > 900 and counts["cf32_be"] == wanted, counts
    assert counts["ci16_le"] == counts["ci16_be"] and abs(counts["ci16_le"] - wanted) <= 3, counts
    assert counts["ci8"] == counts["cu8"] and abs(counts["ci8"] - wanted) < 0.03 * wanted, counts


def test_a_file_of_samples_alone(tmp_path):
    path = tmp_path / "firn.fc32"
    path.write_bytes(encoded(link(50000, 14), "cf32_le") + b"abc")
    report, done = judge(path, "--format", "cf32_le")
    assert report["total"]["in"] == 50000 and "time" not in report and "seconds" not in report["total"]
    assert "last 3 bytes" in done.stderr
    assert "say their format" in refused("judge", path, "--set", FIRN, "--pattern", PATTERN, "--ser", "0.1")


def test_captures_with_a_gap_give_an_overflow_and_utc(tmp_path):
    samples = np.concatenate([link(30000, 20, seed=1), link(30000, 20, seed=2, first=31234)])
    first = {"core:sample_start": 0, "core:datetime": "2026-12-01T06:30:00Z", "core:global_index": 0}
    path = sigmf(tmp_path, samples, captures=[first, {"core:sample_start": 30000, "core:global_index": 31234}])
    total = judge(path)[0]["total"]
    assert total["excluded"]["slip"] == 0 and total["slips"] == 0 and total["symbol_errors"] == 0 and account_holds(total)
    path = sigmf(tmp_path, samples, captures=[first, {"core:sample_start": 30000, "core:global_index": 31234, "core:datetime": "2026-12-01T06:30:03.1234Z"}])
    report, _ = judge(path, "--log", tmp_path / "log.jsonl")
    assert report["time"] == "2026-12-01T06:30:06.123Z" and report["recording"]["gaps"] == 1  # 3.1234 s + 29,999 symbols at 10 kHz
    lines = [json.loads(line) for line in (tmp_path / "log.jsonl").read_text().splitlines()]
    assert lines[0]["schema"] == "halfplane/settings/1" and lines[0]["settings"] == report["settings"]
    assert [line["time"] for line in lines[1:4]] == ["2026-12-01T06:30:00.999Z", "2026-12-01T06:30:01.999Z", "2026-12-01T06:30:02.999Z"]
    assert {**lines[-1], "settings": report["settings"], "recording": report["recording"]} == report


def test_slip_is_left_out_as_a_slip(tmp_path):
    samples = np.delete(link(60000, 20), slice(30000, 30005))
    total = judge(sigmf(tmp_path, samples))[0]["total"]
    assert total["slips"] == 1 and total["in"] == 59995 and account_holds(total)
    assert total["symbol_errors"] + total["excluded"]["slip"] < 100


def test_input_es_n0_gives_the_shortfall_there(tmp_path):
    report, _ = judge(sigmf(tmp_path, link(200000, 14)), "--input-es-n0", "15")
    found = report["shortfall"]["input"]
    assert found["db_low"] < 1 < found["db_high"] and found["db_high"] - found["db_low"] < 0.3


def test_digest_is_verified(tmp_path):
    samples = link(20000, 20)
    good = hashlib.sha512(encoded(samples, "cf32_le")).hexdigest()
    path = sigmf(tmp_path, samples, core_sha512=good.upper())
    assert judge(path)[0]["recording"]["sha512"] == "verified"
    arguments = ("judge", sigmf(tmp_path, samples, core_sha512="0" * 128), "--set", FIRN, "--pattern", PATTERN, "--ser", "0.1")
    assert "SHA-512" in refused(*arguments)
    done = halfplane(*arguments, "--unverified")
    assert done.returncode == 0 and "shortfall at the decision  ≤ " in done.stdout, done.stderr  # no error was counted


def test_described_recording_is_judged_without_being_told(tmp_path):
    path = tmp_path / "firn.cf32"
    path.write_bytes(encoded(link(50000, 14), "cf32_le"))
    done = halfplane(
        "describe", path, "--symbol-rate", "1e4", "--datetime", "2026-12-01T07:30:00+01:00", "--frequency", "869.525e6",
        "--description", "Firn line, cabled", "--set", FIRN, "--pattern", PATTERN, "--digest",
    )  # fmt: skip
    meta = tmp_path / "firn.sigmf-meta"
    assert (done.returncode, done.stdout) == (0, f"written: {meta}\n"), done.stderr
    document = json.loads(meta.read_text())
    assert document["global"]["core:datatype"] == "cf32_le" and document["global"]["core:dataset"] == "firn.cf32"
    assert document["global"]["core:extensions"] == [{"name": "halfplane", "version": "1.0.0", "optional": True}]
    assert document["captures"] == [{"core:sample_start": 0, "core:frequency": 869525000.0, "core:datetime": "2026-12-01T06:30:00.000000Z"}]
    assert document["annotations"] == []
    done = halfplane("judge", meta, "--ser", "0.03", "--json")
    report = json.loads(done.stdout)
    assert done.returncode == 0 and report["set"] == "firn-12" and report["time"] == "2026-12-01T06:30:04.999Z"
    assert report["recording"]["sha512"] == "verified" and report["pattern"] == PATTERN
    assert report["total"] == judge(path, "--format", "cf32_le", "--symbol-rate", "1e4")[0]["total"]


def test_describe_refuses(tmp_path):
    path = tmp_path / "a.sigmf-data"
    path.write_bytes(bytes(800))
    assert "no format" in refused("describe", path, "--format", "rf32_le")
    assert "time zone" in refused("describe", path, "--datetime", "2026-12-01T06:30:00")
    assert "means nothing elsewhere" in refused("describe", path, "--pattern", "file:x")
    assert "points" in refused("describe", path, "--set", FIRN, "--pattern", "o150:9")
    assert not (tmp_path / "a.sigmf-meta").exists()
    assert recordings.write_meta(path, sample_rate=5) == tmp_path / "a.sigmf-meta"
    assert "there already" in refused("describe", path)
    assert halfplane("describe", path, "--replace").returncode == 0


def test_refusals(tmp_path):
    path = sigmf(tmp_path, link(1000, 20))
    told = ("--set", FIRN, "--pattern", PATTERN)
    assert "No such file" in refused("judge", tmp_path / "none.sigmf-meta", *told, "--ser", "0.1")
    assert "give one of" in refused("judge", path, *told)
    assert "give one of" in refused("judge", path, *told, "--ser", "0.1", "--ber", "0.1")
    assert "--frame" in refused("judge", path, *told, "--fer", "0.1")
    assert "give --set" in refused("judge", path, "--pattern", PATTERN, "--ser", "0.1")
    assert "give --pattern" in refused("judge", path, "--set", FIRN, "--ser", "0.1")
    assert "one sample a symbol" in refused("judge", path, *told, "--ser", "0.1", "--symbol-rate", "2500")
    assert "cannot be opened" in refused("judge", path, *told, "--ser", "0.1", "--log", tmp_path / "no" / "log")
    (tmp_path / "a.sigmf-data").unlink()
    assert "a.sigmf-data: No such file" in refused("judge", path, *told, "--ser", "0.1")


def test_ctrl_c_judges_what_was_read(tmp_path):
    """A sparse file of a terabyte of silence: only Ctrl-C ends it."""
    path = tmp_path / "long.cf32"
    path.write_bytes(encoded(link(100000, 14), "cf32_le"))
    os.truncate(path, 1 << 40)
    environment = {key: value for key, value in os.environ.items() if key != "PYTHONPATH"}
    command = [str(BUILD / "halfplane"), "judge", str(path), "--format", "cf32_le", "--set", FIRN, "--pattern", PATTERN, "--ser", "0.03"]
    log = tmp_path / "log.jsonl"
    running = subprocess.Popen(
        [*command, "--window", "10000", "--log", str(log), "--json"], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment
    )
    while not (log.exists() and log.read_text().count("\n") > 3):
        assert running.poll() is None, running.stderr.read()
    running.send_signal(signal.SIGINT)
    out, said = running.communicate(timeout=60)
    report = json.loads(out)
    assert running.returncode == 130 and "interrupted after" in said
    assert report["total"]["in"] == report["recording"]["read"] and report["total"]["judged"] > 90000 and account_holds(report["total"])
