# SPDX-License-Identifier: GPL-3.0-or-later
"""The core on numpy arrays: shapes, and figures against NumPy and SciPy."""

import numpy as np
import pytest
from command import FIRN
from gnuradio import halfplane
from scipy.special import erfc
from scipy.stats import beta, chi2

SET = halfplane.load_set(FIRN)


def test_signal_set_keeps_what_it_is_given():
    points = np.array([1 + 1j, -1 + 0.5j, 0.25 - 2j])
    made = halfplane.signal_set(points, ["10", "01", "00"], priors=[0.5, 0.25, 0.25], name="three")
    np.testing.assert_array_equal(made.points, points)
    assert made.label_strings == ["10", "01", "00"] and list(made.labels) == [2, 1, 0] and len(made) == 3
    assert made.es == pytest.approx(np.sum(made.priors * abs(points) ** 2), rel=1e-15)
    assert made.entropy_bits == pytest.approx(1.5, rel=1e-15)
    assert made.index_of_label("01") == 1 and made.index_of_label("11") is None


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (([1, 1],), "point 1"),
        (([1, -1], ["0", "01"]), "index 1"),
        (([1, -1], [0, 2]), "does not fit"),
        (([1, -1], ["0", "x"]), "index 1"),
        (([[1, -1]],), "one dimension"),
    ],
)
def test_signal_set_refuses(arguments, says):
    with pytest.raises(halfplane.invalid_set, match=says):
        halfplane.signal_set(*arguments)


def test_rates_take_and_give_any_shape():
    predictor = halfplane.predictor(SET)
    at = np.array([[0.0, 5.0, 10.0], [12.0, 15.0, 20.0]])
    rates = predictor.rates(at)
    assert rates["exact"]["ser_by_point"].shape == (2, 3, 12) and rates["exact"]["ber_by_bit"].shape == (2, 3, 4)
    for rung in ("exact", "facing", "union", "nearest"):
        np.testing.assert_allclose(rates[rung]["ser"], predictor.ser(at, rung), rtol=1e-12)
        np.testing.assert_allclose(rates[rung]["ber"], predictor.ber(at, rung), rtol=1e-12)
    assert isinstance(predictor.ser(10), float)


def test_union_and_nearest_against_sums_in_numpy():
    at = np.arange(0.0, 30.0, 3.0)
    d = abs(SET.points[:, None] - SET.points)
    n0 = SET.es / 10 ** (at / 10)
    pair = erfc(d[..., None] / (2 * np.sqrt(n0))) / 2
    others = ~np.eye(12, dtype=bool)
    near = others & (abs(d - SET.d_min) < 1e-9)
    predictor = halfplane.predictor(SET)
    np.testing.assert_allclose(predictor.ser(at, "union"), (pair * others[..., None]).sum((0, 1)) / 12, rtol=1e-11)
    np.testing.assert_allclose(predictor.ser(at, "nearest"), (pair * near[..., None]).sum((0, 1)) / 12, rtol=1e-11)


def test_transitions_explain_the_rates():
    predictor = halfplane.predictor(SET)
    (p,) = predictor.transitions([8.0])
    np.testing.assert_allclose(p.sum(1), 1, rtol=1e-13)
    wrong = np.array([[bin(a ^ b).count("1") for b in SET.labels.tolist()] for a in SET.labels.tolist()])
    assert predictor.ber(8.0) == pytest.approx((p * wrong).sum() / 12 / 4, rel=1e-12)
    np.testing.assert_allclose(predictor.expected_counts(8.0, [7] * 12), 7 * p, rtol=1e-12)


def test_inverse_and_slope():
    predictor = halfplane.predictor(SET)
    at = predictor.es_n0_db_for_ser([0.1, 1e-3, 1e-9])
    np.testing.assert_allclose(predictor.ser(at), [0.1, 1e-3, 1e-9], rtol=1e-9)
    slope = (np.log10(predictor.ser(at + 1e-4)) - np.log10(predictor.ser(at - 1e-4))) / 2e-4
    np.testing.assert_allclose(predictor.ser_decades_per_db(at), slope, rtol=1e-6)
    with pytest.raises(ValueError, match="cannot be reached"):
        predictor.es_n0_db_for_ser(0.99)


def test_displaced_points_at_their_places_change_nothing():
    predictor = halfplane.predictor(SET)
    np.testing.assert_allclose(halfplane.displaced_points(SET), SET.points, rtol=1e-15)
    turned = halfplane.displaced_points(SET, rotation=0.1)
    np.testing.assert_allclose(turned, SET.points * np.exp(0.1j), rtol=1e-12)
    assert predictor.displaced(12.0, SET.points)["ser"] == pytest.approx(predictor.ser(12.0), rel=1e-10)
    assert predictor.displaced(12.0, turned)["ser"] > 1.2 * predictor.ser(12.0)


def test_intervals_against_scipy():
    low, high = halfplane.binomial_interval(3, 100)
    assert (low, high) == pytest.approx((beta.ppf(0.025, 3, 98), beta.ppf(0.975, 4, 97)), rel=1e-10)
    low, high = halfplane.clumped_interval(12, 1000, 2.0)  # 6 clumps of 2
    assert (low, high) == pytest.approx((chi2.ppf(0.025, 12) / 1000, chi2.ppf(0.975, 14) / 1000), rel=1e-10)
    assert halfplane.binomial_interval(0, 10)[0] is None


def test_tally_and_gauge_against_numpy():
    rng = np.random.default_rng(2026)
    sent = halfplane.pattern("draw:2026", SET).indices(0, 20000)
    gain = 0.5 * np.exp(0.7j)
    received = (gain * SET.points[sent] + 0.1 * (rng.normal(size=20000) + 1j * rng.normal(size=20000))).astype(np.complex64)
    decided = np.argmin(abs(received[:, None] / gain - SET.points), axis=1)
    tally = halfplane.tally(SET)
    tally.count(sent, decided)
    assert tally.symbols == 20000 and tally.symbol_errors == np.count_nonzero(sent != decided) > 0
    assert tally.bit_errors == sum(bin(a ^ b).count("1") for a, b in zip(SET.labels[sent].tolist(), SET.labels[decided].tolist()))
    assert sum(tally.transitions.values()) == tally.symbol_errors
    np.testing.assert_array_equal(tally.sent, np.bincount(sent, minlength=12))
    gauge = halfplane.gauge(SET)
    gauge.add(received, sent, decided)
    fit, *_ = np.linalg.lstsq(np.column_stack([SET.points[sent], np.ones(20000)]), received, rcond=None)
    found = gauge.solve()
    np.testing.assert_allclose([found.gain, found.offset], fit, atol=1e-6)
    rest = received - fit[0] * SET.points[sent] - fit[1]
    assert found.n0 == pytest.approx(np.sum(abs(rest) ** 2) / 19998, rel=1e-5)
    with pytest.raises(ValueError, match="no index"):
        tally.count([12], [0])


def test_information_of_bpsk_against_a_dense_sum():
    # I(X;Y) of ±1 over real noise of variance N0/2: 1 − E log2(1 + exp(−4y/N0)), summed on a fine grid.
    n0 = 10 ** (-0.2)
    y = np.linspace(-12, 14, 400001)
    density = np.exp(-((y - 1) ** 2) / n0) / np.sqrt(np.pi * n0)
    want = 1 - np.sum(density * np.logaddexp(0, -4 * y / n0)) / np.log(2) * (y[1] - y[0])
    assert halfplane.information(halfplane.load_set("psk:2"), 2.0)["mi"] == pytest.approx(want, abs=1e-9)
