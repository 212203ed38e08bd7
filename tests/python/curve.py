# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane curve`: its documents, tables and CSV, against closed forms in SciPy and mpmath."""

import csv
import math

import mpmath
import numpy as np
import pytest
from command import FIRN, document, halfplane
from scipy.special import erfc


def q(x):
    return erfc(x / math.sqrt(2)) / 2


def test_schema():
    curve = document("curve", FIRN, "--es-n0", "4..12/4")
    assert set(curve) == {"set", "law", "detector", "rows"}
    assert curve["set"]["name"] == "firn-12" and curve["set"]["size"] == 12
    assert curve["law"] == "awgn" and curve["detector"] == "ml"
    assert [row["es_n0_db"] for row in curve["rows"]] == [4.0, 8.0, 12.0]
    for row in curve["rows"]:
        # Eb = Es / H, H = log2 12: not the 4 bits of a label.
        assert row["eb_n0_db"] == pytest.approx(row["es_n0_db"] - 10 * math.log10(math.log2(12)), abs=1e-12)
        for rung in ("exact", "facing", "union", "nearest"):
            assert {"ser", "ber", "ber_if_gray"} <= set(row[rung])
            assert row[rung]["ber_if_gray"] == pytest.approx(row[rung]["ser"] / 4, rel=1e-15)
        exact = row["exact"]
        assert len(exact["ber_by_bit"]) == 4 and len(exact["ser_by_point"]) == 12
        assert np.mean(exact["ber_by_bit"]) == pytest.approx(exact["ber"], rel=1e-13)
        assert np.mean(exact["ser_by_point"]) == pytest.approx(exact["ser"], rel=1e-13)
        assert math.exp(exact["ln_ser"]) == pytest.approx(exact["ser"], rel=1e-13)
        assert exact["ser"] < row["facing"]["ser"] < row["union"]["ser"]


def test_qpsk_against_the_closed_form():
    # Proakis, Digital Communications, 4th ed., (5.2-57) to (5.2-59), with Q(x) from SciPy: SER = 2q − q², BER = q.
    worst = 0.0
    for row in document("curve", "qam:4", "--es-n0", "-10..30/2")["rows"]:
        bit = q(math.sqrt(10 ** (row["es_n0_db"] / 10)))
        for got, want in ((row["exact"]["ser"], bit * (2 - bit)), (row["exact"]["ber"], bit)):
            worst = max(worst, abs(got / want - 1))
    print(f"worst relative error {worst:.1e}")
    assert worst < 1e-12


def test_below_the_smallest_double_the_logarithm_stands_alone():
    (row,) = document("curve", "qam:4", "--es-n0", "40")["rows"]
    mpmath.mp.dps = 30
    bit = mpmath.erfc(mpmath.sqrt(mpmath.mpf(10) ** 4 / 2)) / 2
    assert bit < mpmath.mpf(10) ** -2000
    for rung in ("exact", "facing", "union", "nearest"):
        assert not {"ser", "ber", "ber_if_gray"} & set(row[rung])
    assert "ser_by_point" not in row["exact"] and "ber_by_bit" not in row["exact"]
    assert row["exact"]["ln_ber"] == pytest.approx(float(mpmath.log(bit)), rel=1e-12)
    assert row["exact"]["ln_ser"] == pytest.approx(float(mpmath.log(2 * bit - bit**2)), rel=1e-12)


def test_a_label_bit_that_never_changes_never_errs(tmp_path):
    # Both labels begin with 0: that bit has an error rate of exactly 0, and this zero is the truth.
    path = tmp_path / "two.csv"
    path.write_text("label,i,q\n00,-1,0\n01,1,0\n")
    (row,) = document("curve", path, "--es-n0", "3")["rows"]
    assert row["exact"]["ber_by_bit"][0] == 0
    assert row["exact"]["ber_by_bit"][1] == pytest.approx(q(math.sqrt(2 * 10**0.3)), rel=1e-12)


def test_eb_n0_is_es_n0_shifted():
    by_eb = document("curve", FIRN, "--eb-n0", "2..4/1")["rows"]
    shift = 10 * math.log10(math.log2(12))
    assert [row["eb_n0_db"] for row in by_eb] == pytest.approx([2, 3, 4], abs=1e-12)
    (by_es,) = document("curve", FIRN, "--es-n0", repr(3 + shift))["rows"]
    assert by_es["exact"]["ser"] == pytest.approx(by_eb[1]["exact"]["ser"], rel=1e-12)


def test_table_shows_what_the_document_holds():
    text = halfplane("curve", "psk:8", "--es-n0", "10").stdout
    (row,) = document("curve", "psk:8", "--es-n0", "10")["rows"]
    line = text.splitlines()[-1]
    for rung, kind in (("exact", "ser"), ("facing", "ser"), ("union", "ser"), ("nearest", "ser"), ("exact", "ber"), ("union", "ber")):
        assert f"{row[rung][kind]:.3e}" in line
    assert line.split()[0] == "10.00"


def test_csv_is_the_document(tmp_path):
    path = tmp_path / "curve.csv"
    curve = document("curve", "qam:16", "--es-n0", "0..60/30", "--csv", path)
    with path.open(newline="") as stream:
        lines = list(csv.DictReader(stream))
    assert len(lines) == len(curve["rows"]) == 3
    for line, row in zip(lines, curve["rows"]):
        assert float(line["es_n0_db"]) == row["es_n0_db"]
        for rung in ("exact", "facing", "union", "nearest"):
            for kind in ("ser", "ber", "ln_ser", "ln_ber", "ber_if_gray"):
                cell = line[f"{rung}_{kind}"]
                assert (float(cell) if cell else None) == row[rung].get(kind)
    assert lines[2]["exact_ser"] == "" and float(lines[2]["exact_ln_ser"]) < -700
