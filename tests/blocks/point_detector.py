# SPDX-License-Identifier: GPL-3.0-or-later
"""point_detector against brute force in double precision, in every output format and awkward chunks."""

import numpy as np
import pytest
from gnuradio import blocks, gr, halfplane

from graph import AWKWARD_CHUNKS, run_through


def brute_force(points, samples, n0=0, priors=None):
    """argmax Re(r s*) - |s|^2/2 + N0/2 ln p; the lower index on ties."""
    metric = np.real(samples[:, None].astype(complex) * np.conj(points)) - np.abs(points) ** 2 / 2
    if n0:
        metric += n0 / 2 * np.log(priors)
    return np.argmax(metric, axis=1)


def random_set(size, rng, priors=None):
    bits = max(1, int(np.ceil(np.log2(size))))
    labels = [int(label) for label in rng.permutation(2**bits)[:size]]
    points = rng.normal(size=size) + 1j * rng.normal(size=size)
    return halfplane.signal_set(list(points), labels, bits, [] if priors is None else list(priors)), points, np.array(labels), bits


def samples_about(points, count, rng):
    """Samples about the points and, some, far outside."""
    spread = np.where(rng.random(count) < 0.9, 0.3, 30.0)
    noise = rng.normal(size=count) + 1j * rng.normal(size=count)
    return (points[rng.integers(len(points), size=count)] + spread * noise).astype(np.complex64)


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
@pytest.mark.parametrize("size", [2, 5, 12, 64, 256])
def test_nearest_point(size, chunk):
    rng = np.random.default_rng(size)
    which, points, _, _ = random_set(size, rng)
    samples = samples_about(points, 5003, rng)
    out = run_through(halfplane.point_detector(which), samples, "c", "s", chunk)
    assert np.array_equal(out, brute_force(points, samples))


@pytest.mark.parametrize("size", [2, 12, 64])
def test_labels_and_bits(size):
    rng = np.random.default_rng(size)
    which, points, labels, label_bits = random_set(size, rng)
    samples = samples_about(points, 3001, rng)
    expected = labels[brute_force(points, samples)]
    assert np.array_equal(run_through(halfplane.point_detector(which, "labels"), samples, "c", "s"), expected)
    bits = run_through(halfplane.point_detector(which, "bits"), samples, "c", "b")
    assert np.array_equal(bits.reshape(-1, label_bits), (expected[:, None] >> np.arange(label_bits)[::-1]) & 1)


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
@pytest.mark.parametrize("size", [2, 12, 255])
def test_indices_as_bytes(size, chunk):
    rng = np.random.default_rng(size)
    which, points, _, _ = random_set(size, rng)
    samples = samples_about(points, 3001, rng)
    samples[17] = np.nan
    out = run_through(halfplane.point_detector(which, "byte_indices"), samples, "c", "b", chunk)
    shorts = run_through(halfplane.point_detector(which), samples, "c", "s")
    assert shorts[17] == -1 and out[17] == 255
    assert np.array_equal(np.delete(out, 17), np.delete(shorts, 17))
    back = run_through(halfplane.point_mapper(which, "byte_indices"), np.delete(out, 17), "b", "c")
    assert np.array_equal(back, points[np.delete(shorts, 17)].astype(np.complex64))


def test_bytes_hold_no_more_than_255_indices():
    which, _, _, _ = random_set(256, np.random.default_rng(1))
    for block in (halfplane.point_detector, halfplane.point_mapper):
        with pytest.raises(ValueError, match="byte_indices hold sets of up to 255 points, this one has 256"):
            block(which, "byte_indices")
    small, _, _, _ = random_set(12, np.random.default_rng(2))
    detector = halfplane.point_detector(small, "byte_indices")
    with pytest.raises(ValueError, match="this one has 256"):
        detector.set_signal_set(which)


def test_mapper_and_detector_invert_each_other_on_bits():
    rng = np.random.default_rng(3)
    which, _, _, label_bits = random_set(64, rng)
    bits = rng.integers(2, size=label_bits * 1001)
    samples = run_through(halfplane.point_mapper(which, "bits"), bits, "b", "c")
    assert np.array_equal(run_through(halfplane.point_detector(which, "bits"), samples, "c", "b"), bits)


@pytest.mark.parametrize("n0", [0.01, 0.5, 4.0])
def test_most_probable_point(n0):
    rng = np.random.default_rng(8)
    priors = rng.dirichlet(np.full(12, 0.5))
    which, points, _, _ = random_set(12, rng, priors)
    samples = samples_about(points, 5003, rng)
    out = run_through(halfplane.point_detector(which, "indices", n0), samples, "c", "s")
    expected = brute_force(points, samples, n0, priors)
    assert np.array_equal(out, expected)
    assert n0 < 0.1 or np.any(expected != brute_force(points, samples))  # the priors do decide something


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf, complex(0, np.nan), complex(1, np.inf)])
def test_nonfinite_samples_have_no_point(bad):
    which = halfplane.signal_set([1, 1j, -1, -1j], [0, 1, 2, 3], 2)
    samples = np.array([1, bad, -1j], dtype=np.complex64)
    assert list(run_through(halfplane.point_detector(which), samples, "c", "s")) == [0, -1, 3]
    assert list(run_through(halfplane.point_detector(which, "labels"), samples, "c", "s")) == [0, -1, 3]
    assert list(run_through(halfplane.point_detector(which, "bits"), samples, "c", "b")) == [0, 0, 255, 255, 1, 1]


@pytest.mark.parametrize("arguments, message", [
    (("octets",), "point_detector: output is 'octets'"),
    (("indices", -1.0), "point_detector: n0 is -1"),
    (("indices", float("nan")), "point_detector: n0 is nan"),
    (("indices", float("inf")), "point_detector: n0 is inf"),
])
def test_refused(arguments, message):
    which = halfplane.signal_set([1, -1], [0, 1], 1)
    with pytest.raises(ValueError, match=message):
        halfplane.point_detector(which, *arguments)


def test_setters():
    two = halfplane.signal_set([1, -1], [0, 1], 1, [0.9, 0.1])
    block = halfplane.point_detector(two, "bits")
    assert block.n0() == 0
    block.set_n0(2.0)
    assert block.n0() == 2.0
    # threshold at -N0/4 ln(0.9/0.1) = -1.0986 for points 1, -1 (N0 ln(p0/p1) / (2 d), d = 2)
    samples = np.array([-1.09, -1.11], dtype=np.complex64)
    assert list(run_through(block, samples, "c", "b")) == [0, 1]
    with pytest.raises(ValueError, match="n0 is -3"):
        block.set_n0(-3)
    with pytest.raises(ValueError, match="label bits of the new set is 2"):
        block.set_signal_set(halfplane.signal_set([1, 1j, -1, -1j], [0, 1, 2, 3], 2))
    block.set_signal_set(halfplane.signal_set([-1, 1], [0, 1], 1))
    assert list(run_through(block, np.array([-0.5, 0.5]), "c", "b")) == [0, 1]


def test_setters_while_running():
    """Decisions stay right, sample by sample, for one set or the other, while sets change from another thread."""
    rng = np.random.default_rng(5)
    one = halfplane.signal_set([1, -1], [0, 1], 1)
    other = halfplane.signal_set([-1, 1], [0, 1], 1)
    block = halfplane.point_detector(one)
    samples = (np.sign(rng.normal(size=400000)) + 0j).astype(np.complex64)
    source, sink = blocks.vector_source_c(samples.tolist()), blocks.vector_sink_s()
    graph = gr.top_block()
    graph.connect(source, block, sink)
    graph.start()
    for k in range(200):
        block.set_signal_set(other if k % 2 else one)
        block.set_n0(0.1 if k % 3 else 0)
    graph.wait()
    out = np.array(sink.data())
    assert len(out) == len(samples) and set(out) <= {0, 1}
