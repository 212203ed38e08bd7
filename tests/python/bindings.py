# SPDX-License-Identifier: GPL-3.0-or-later
"""The core on numpy arrays: shapes, and figures against NumPy and SciPy."""

import numpy as np
import pytest
from command import FIRN
from gnuradio import halfplane
from scipy.integrate import quad
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


def test_live_traffic_is_gauged_blindly():
    rng = np.random.default_rng(4)
    points = np.array(SET.points)
    noise = np.sqrt(SET.es / 10**1.4 / 2) * (rng.normal(size=50000) + 1j * rng.normal(size=50000))
    found = halfplane.gauge_blindly(SET, 3 * (rng.choice(points, 50000, p=SET.priors) + noise))
    assert abs(found.es_n0_db - 14) < 4.5 * found.es_n0_db_se < 0.2
    assert abs(found.gain / 3 - 1) < 0.01 and 16384 <= found.samples <= 32768
    assert halfplane.gauge_blindly(SET, points[:10]) is None
    with pytest.raises(ValueError, match="received sample 1 is not finite"):
        halfplane.gauge_blindly(SET, [1, np.nan])


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


def test_gap_to_capacity_of_two_points():
    """Two points on AWGN: I = 1 - E[log2(1 + exp(-L))], L ~ N(4γ, 8γ); here by SciPy's adaptive quadrature."""
    gamma = 10 ** (np.array([-10.0, 0.0, 5.0]) / 10)
    bits = [
        1 - quad(lambda x, g=g: np.exp(-x * x / 2) / np.sqrt(2 * np.pi) * np.log2(1 + np.exp(-(4 * g + np.sqrt(8 * g) * x))), -38, 38,
                 epsabs=1e-13, epsrel=1e-12, limit=500)[0] for g in gamma
    ]  # fmt: skip
    pair = halfplane.load_set("psk:2")
    at = 10 * np.log10(gamma)
    np.testing.assert_allclose(halfplane.information(pair, at)["mi"], bits, atol=1e-9)
    gap = halfplane.capacity_gap_db(at, halfplane.information(pair, at)["mi"])
    np.testing.assert_allclose(gap, 10 * np.log10(gamma / (2 ** np.array(bits) - 1)), atol=1e-7)
    np.testing.assert_allclose(halfplane.es_n0_db_for_information(pair, bits), at, atol=1e-6)
    with pytest.raises(ValueError, match="never carries"):
        halfplane.es_n0_db_for_information(pair, 1.0)


def test_a_mixture_of_ones_own():
    """Two states are two curves, weighted; and a law is the same by its text or as an object."""
    own = halfplane.mixture([(0.9, 1.0), (0.1, 0.1)], "shadow")
    assert own.name == "shadow"
    np.testing.assert_allclose(own.tail([0.0, 2.0]), [1.0, 0.9 * np.exp(-2) + 0.1 * np.exp(-0.2)], rtol=1e-14)
    at = np.array([5.0, 10.0, 15.0])
    plain, mixed = halfplane.predictor(SET), halfplane.predictor(SET, own)
    np.testing.assert_allclose(mixed.ser(at), 0.9 * plain.ser(at) + 0.1 * plain.ser(at - 10), rtol=1e-12)
    assert halfplane.predictor(SET, halfplane.law_of("rician:6")).ser(10.0) == halfplane.predictor(SET, "rician:6").ser(10.0)
    assert halfplane.law_of("awgn").ln_tail(5000.0) == -5000
    for states, says in (([(0.5, 1.0)], "sum"), ([(0.5, 1.0), (0.5, 0.0)], "gain")):
        with pytest.raises(ValueError, match=says):
            halfplane.mixture(states)


def test_noise_that_is_not_circular():
    """Two points on the real axis see the in-phase noise alone: Q(d/2σ_i), σ_i² = N0·ii/(ii + qq)."""
    pair = halfplane.load_set("psk:2")
    at = np.array([0.0, 6.0, 10.0])
    sigma = np.sqrt(10 ** (-at / 10) * 3 / 4)
    for decision in ("matched", "nearest"):
        shaped = halfplane.predictor(pair, noise=halfplane.noise_shape(3.0, 0.0, 1.0, decision))
        np.testing.assert_allclose(shaped.ser(at), erfc(1 / (sigma * np.sqrt(2))) / 2, rtol=1e-12)
    with pytest.raises(ValueError, match="positive definite"):
        halfplane.predictor(pair, noise=halfplane.noise_shape(1.0, 1.0, 1.0))
    with pytest.raises(ValueError, match="matched, nearest"):
        halfplane.noise_shape(decision="own")


def test_displaced_means_by_list_by_function_and_among_neighbours():
    predictor = halfplane.predictor(SET)
    at = np.array([8.0, 14.0])
    turn = np.exp(0.05j)
    by_list = predictor.displaced(at, SET.points * turn)
    by_function = predictor.displaced(at, lambda s: s * turn)
    np.testing.assert_allclose(by_list["ser"], by_function["ser"], rtol=1e-12)
    assert np.all(by_list["ser"] > predictor.ser(at))
    # An interfering symbol at -20 dB, any of the twelve: the mean over all twelve is the plain sum of twelve runs.
    i, k = (part.ravel() for part in np.meshgrid(np.arange(12), np.arange(12)))
    among = predictor.displaced_among(at, i, SET.points[i] + 0.1 * SET.points[k], np.full(144, 1 / 144))
    each = [predictor.displaced(at, SET.points + 0.1 * SET.points[n])["ser"] for n in range(12)]
    np.testing.assert_allclose(among["ser"], np.mean(each, axis=0), rtol=1e-12)
    with pytest.raises(ValueError, match="one length"):
        predictor.displaced_among(at, [0, 1], [1.0], [1.0])


def test_transition_rows_over_es_n0():
    predictor = halfplane.predictor(SET)
    at = np.array([[3.0, 9.0]])
    rows = predictor.transition_row(at, 2)
    assert rows.shape == (1, 2, 12)
    np.testing.assert_allclose(rows, predictor.transitions(at)[:, :, 2], rtol=1e-12)
