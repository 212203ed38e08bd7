# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane require` and `halfplane plan` against closed forms in SciPy."""

import math

import pytest
from command import FIRN, document, refused
from scipy.optimize import brentq
from scipy.special import erfc
from scipy.stats import binom


def test_qpsk_needs_what_the_closed_form_says():
    # BER of Gray QPSK is Q(√(Es/N0)) (Proakis, 4th ed., (5.2-57)); solved here by SciPy's Brent.
    want = brentq(lambda db: math.log(erfc(math.sqrt(10 ** (db / 10) / 2)) / 2) - math.log(1e-6), 0, 30, xtol=1e-13)
    got = document("require", "qam:4", "--ber", "1e-6")
    assert got["es_n0_db"] == pytest.approx(want, abs=1e-9)
    assert got["eb_n0_db"] == pytest.approx(want - 10 * math.log10(2), abs=1e-9)
    assert got["shannon_gap_db"] == pytest.approx(want - 10 * math.log10(3), abs=1e-9)  # 2^2 − 1 = 3
    assert got["rung"] == "exact" and got["law"] == "awgn" and got["target"] == {"ber": 1e-6}


def test_require_inverts_curve_on_every_rung():
    for rung in ("exact", "facing", "union", "nearest"):
        at = document("require", FIRN, "--ser", "1e-5", "--rung", rung)["es_n0_db"]
        (row,) = document("curve", FIRN, "--es-n0", repr(at))["rows"]
        assert row[rung]["ser"] == pytest.approx(1e-5, rel=1e-8)


def test_plan_against_the_binomial_distribution():
    plan = document("plan", "--ber", "1e-3", "--confidence", "0.9", "--symbol-rate", "1e4", "--bits-per-symbol", "2")
    assert plan["rows"][0]["trials"] == math.ceil(math.log(0.1) / math.log1p(-1e-3))
    for row in plan["rows"]:
        n, k = row["trials"], row["allowed_errors"]
        # The shortest such test: n keeps the consumer's risk, n − 1 does not.
        assert binom.cdf(k, n, 1e-3) <= 0.1 < binom.cdf(k, n - 1, 1e-3)
        assert row["symbols"] == math.ceil(n / 2) and row["seconds"] == pytest.approx(math.ceil(n / 2) / 1e4)
        assert binom.cdf(k, n, row["rate_half_pass"]) == pytest.approx(0.5, rel=1e-8)
        assert binom.cdf(k, n, row["rate_usually_pass"]) == pytest.approx(0.9, rel=1e-8)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (["require", FIRN], "--ser or --ber"),
        (["require", FIRN, "--ser", "0"], "not between 0 and 1"),
        (["require", FIRN, "--ser", "0.1", "--rung", "best"], "best"),
        (["require", FIRN, "--ser", "0.9999"], "cannot be reached"),
        (["plan"], "--ser or --ber"),
        (["plan", "--ber", "1e-3", "--confidence", "1"], "not between 0 and 1"),
        (["plan", "--ser", "1e-3", "--bits-per-symbol", "2"], "--ber"),
        (["plan", "--ber", "1e-3", "--symbol-rate", "0"], "above 0"),
    ],
)
def test_refusals(arguments, says):
    assert says in refused(*arguments)
