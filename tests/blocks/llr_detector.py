# SPDX-License-Identifier: GPL-3.0-or-later
"""llr_detector against the defining sums in double precision with logsumexp, in awkward chunks; setters while running."""

import numpy as np
import pytest
from gnuradio import blocks, gr, halfplane
from scipy.special import logsumexp

from graph import AWKWARD_CHUNKS, run_through

ACCURACY = 1e-3  # absolute or relative, whichever is larger, as promised to the user; the kernel's own test asks for more


def ratios(points, labels, bits, samples, n0, priors, rule="exact"):
    """ln P(bit = 0 | r) - ln P(bit = 1 | r) for each sample and bit, leftmost bit first."""
    r = samples.astype(complex)[:, None]
    # |r|^2 is common to all; without it nothing is lost far outside.
    metric = (2 * np.real(r * np.conj(points)) - np.abs(points) ** 2) / n0 + np.log(priors)
    combine = logsumexp if rule == "exact" else np.max
    columns = []
    for k in range(bits):
        one = (labels >> (bits - 1 - k)) & 1 == 1
        columns.append(combine(metric[:, ~one], axis=1) - combine(metric[:, one], axis=1))
    return np.stack(columns, axis=1)


def assert_close(out, expected):
    error = np.abs(out - expected) / np.maximum(1, np.abs(expected))
    assert out.shape == expected.shape and np.max(error) <= ACCURACY, np.max(error)


def make_set(kind, rng):
    """A set, its points, labels, bits and priors."""
    if kind == "square":  # a product of in-phase and quadrature under a Gray labelling: the fast path
        levels, gray = np.array([-3, -1, 1, 3]), np.array([0, 1, 3, 2])
        points = np.array([complex(a, b) for a in levels for b in levels])
        labels = np.array([g << 2 | h for g in gray for h in gray])
        bits, priors = 4, np.full(16, 1 / 16)
    else:
        size = int(kind)
        bits = max(1, int(np.ceil(np.log2(size))))
        points = rng.normal(size=size) + 1j * rng.normal(size=size)
        # Every bit must occur as 0 and as 1, whatever is drawn for the rest.
        labels = np.concatenate([[0, 2**bits - 1], 1 + rng.permutation(2**bits - 2)])[:size]
        priors = rng.dirichlet(np.full(size, 2.0))
    return halfplane.signal_set(list(points), [int(x) for x in labels], bits, list(priors)), points, labels, bits, priors


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
@pytest.mark.parametrize("rule", ["exact", "max-log"])
@pytest.mark.parametrize("kind", ["2", "5", "12", "64", "square"])
def test_ratios(kind, rule, chunk):
    rng = np.random.default_rng(len(kind) + 7)
    which, points, labels, bits, priors = make_set(kind, rng)
    count = 2003
    if chunk:
        chunk = max(chunk, bits)  # a call of work() makes all ratios of a sample
    for es_n0_db in (-10, 8, 40):
        n0 = float(np.sum(priors * np.abs(points) ** 2) / 10 ** (es_n0_db / 10))
        noise = np.sqrt(n0 / 2) * (rng.normal(size=count) + 1j * rng.normal(size=count))
        samples = (points[rng.integers(len(points), size=count)] + noise).astype(np.complex64)
        out = run_through(halfplane.llr_detector(which, n0, rule), samples, "c", "f", chunk)
        assert_close(out.reshape(-1, bits), ratios(points, labels, bits, samples, n0, priors, rule))


@pytest.mark.parametrize("count", [0, 1, 7, 15, 16, 17, 511, 513, 1023, 13107])
def test_awkward_lengths(count):
    rng = np.random.default_rng(count)
    which, points, labels, bits, priors = make_set("12", rng)
    samples = (rng.normal(size=count) + 1j * rng.normal(size=count)).astype(np.complex64)
    out = run_through(halfplane.llr_detector(which, 0.3), samples, "c", "f")
    assert out.size == count * bits
    if count:
        assert_close(out.reshape(-1, bits), ratios(points, labels, bits, samples, 0.3, priors))


def test_sign_and_order():
    """The point of label 01 is sent: the left bit is 0, the right one 1."""
    which = halfplane.signal_set([1 + 1j, 1 - 1j, -1 + 1j, -1 - 1j], [0b00, 0b01, 0b10, 0b11], 2)
    samples = np.array([1 - 1j], dtype=np.complex64)
    # |r - (1, y)|^2 differs by 4 between the bit's values: 4 / N0.
    assert list(run_through(halfplane.llr_detector(which, 2.0), samples, "c", "f")) == pytest.approx([2, -2], abs=1e-4)
    flipped = halfplane.llr_detector(which, 2.0, positive=1)
    assert list(run_through(flipped, samples, "c", "f")) == pytest.approx([-2, 2], abs=1e-4)
    clipped = halfplane.llr_detector(which, 2.0, "max-log", 0, 1.5)
    assert list(run_through(clipped, samples, "c", "f")) == [1.5, -1.5]


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf, complex(0, np.nan), complex(1, np.inf)])
def test_nonfinite_samples_say_nothing(bad):
    which = halfplane.signal_set([1, -1], [0, 1], 1)
    samples = np.array([1, bad, -1], dtype=np.complex64)
    assert list(run_through(halfplane.llr_detector(which, 1.0), samples, "c", "f")) == pytest.approx([4, 0, -4], abs=1e-4)


@pytest.mark.parametrize("arguments, message", [
    ((0.0,), "llr_detector: n0 is 0; a finite number > 0"),
    ((-1.0,), "llr_detector: n0 is -1"),
    ((float("nan"),), "llr_detector: n0 is nan"),
    ((float("inf"),), "llr_detector: n0 is inf"),
    ((1.0, "soft"), "llr_detector: rule is 'soft'; one of exact, max-log"),
    ((1.0, "exact", 2), "llr_detector: positive is 2"),
    ((1.0, "exact", 0, 0.0), "llr_detector: saturation is 0"),
    ((1.0, "exact", 0, 2e6), "llr_detector: saturation is 2e"),
    ((1.0, "exact", 0, float("nan")), "llr_detector: saturation is nan"),
])
def test_refused(arguments, message):
    which = halfplane.signal_set([1, -1], [0, 1], 1)
    with pytest.raises(ValueError, match=message):
        halfplane.llr_detector(which, *arguments)


def test_setters():
    block = halfplane.llr_detector(halfplane.signal_set([1, -1], [0, 1], 1), 1.0)
    sample = np.array([0.5], dtype=np.complex64)
    block.set_n0(4.0)
    assert block.n0() == 4.0
    assert list(run_through(block, sample, "c", "f")) == pytest.approx([0.5], abs=1e-4)  # 4·0.5/N0
    with pytest.raises(ValueError, match="n0 is -3"):
        block.set_n0(-3)
    with pytest.raises(ValueError, match="label bits of the new set is 2"):
        block.set_signal_set(halfplane.signal_set([1, 1j, -1, -1j], [0, 1, 2, 3], 2))
    block.set_signal_set(halfplane.signal_set([-1, 1], [0, 1], 1))
    assert list(run_through(block, sample, "c", "f")) == pytest.approx([-0.5], abs=1e-4)


def test_setters_while_running():
    """Each ratio is that of one of the two sets at one of the two N0, never a mixture."""
    rng = np.random.default_rng(5)
    one = halfplane.signal_set([1, -1], [0, 1], 1)
    other = halfplane.signal_set([-1, 1], [0, 1], 1)
    block = halfplane.llr_detector(one, 1.0)
    sign = np.sign(rng.normal(size=400000))
    source, sink = blocks.vector_source_c((sign + 0j).tolist()), blocks.vector_sink_f()
    graph = gr.top_block()
    graph.connect(source, block, sink)
    graph.start()
    for k in range(400):
        block.set_signal_set(other if k % 2 else one)
        block.set_n0(1.0 if k % 3 else 2.0)
    graph.wait()
    out = np.array(sink.data()) * sign
    assert len(out) == len(sign)
    assert np.all(np.min(np.abs(out[:, None] - np.array([4, 2, -4, -2])), axis=1) < 1e-3)
