# SPDX-License-Identifier: GPL-3.0-or-later
"""point_mapper against the set itself, in every input format and awkward chunks."""

import numpy as np
import pytest
from gnuradio import blocks, gr, halfplane

from graph import AWKWARD_CHUNKS, run_through


def random_set(size, rng, spare_bits=0):
    """A set with random points and shuffled labels, some labels unused where spare_bits > 0."""
    bits = max(1, int(np.ceil(np.log2(size)))) + spare_bits
    labels = rng.permutation(2**bits)[:size]
    points = rng.normal(size=size) + 1j * rng.normal(size=size)
    return halfplane.signal_set(list(points), [int(label) for label in labels], bits), points, labels, bits


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
@pytest.mark.parametrize("size", [2, 5, 12, 64, 4096])
def test_indices(size, chunk):
    rng = np.random.default_rng(size)
    which, points, _, _ = random_set(size, rng)
    indices = rng.integers(size, size=20011)
    out = run_through(halfplane.point_mapper(which, "indices"), indices, "s", "c", chunk)
    assert np.array_equal(out, points[indices].astype(np.complex64))


@pytest.mark.parametrize("size, spare", [(2, 0), (5, 1), (12, 0), (64, 2), (4096, 0)])
def test_labels_and_bits_agree_with_indices(size, spare):
    rng = np.random.default_rng(size)
    which, points, labels, label_bits = random_set(size, rng, spare)
    indices = rng.integers(size, size=5003)
    expected = points[indices].astype(np.complex64)
    by_label = run_through(halfplane.point_mapper(which, "labels"), labels[indices], "s", "c")
    assert np.array_equal(by_label, expected)
    # leftmost bit of the label first
    bits = (labels[indices][:, None] >> np.arange(label_bits)[::-1]) & 1
    by_bits = run_through(halfplane.point_mapper(which, "bits"), bits.ravel(), "b", "c")
    assert np.array_equal(by_bits, expected)
    # only the lowest bit of each byte counts
    dirty = bits.ravel() | (rng.integers(128, size=bits.size) << 1)
    assert np.array_equal(run_through(halfplane.point_mapper(which, "bits"), dirty, "b", "c"), expected)


@pytest.mark.parametrize("form, bad", [("indices", 5), ("indices", -1), ("labels", 7), ("labels", -1), ("bits", [1, 1, 1])])
def test_a_symbol_outside_the_set_ends_the_stream(form, bad, capfd):
    which = halfplane.signal_set([0, 1, 2, 3, 4], [0, 1, 2, 3, 4], 3)
    good = [0, 1, 0] * 1000 if form == "bits" else [2] * 1000
    stream = [*good, *np.atleast_1d(bad), *good]
    out = run_through(halfplane.point_mapper(which, form), stream, "b" if form == "bits" else "s", "c")
    assert len(out) == 1000
    assert "symbol 1000 of the input is not in the set of 5 points" in "".join(capfd.readouterr())


def test_unknown_input_is_refused():
    which = halfplane.signal_set([1, -1], [0, 1], 1)
    with pytest.raises(ValueError, match="point_mapper: input is 'octets'"):
        halfplane.point_mapper(which, "octets")


def test_tags_of_bits_reach_the_symbol_that_carries_them():
    which = halfplane.signal_set([1, 1j, -1, -1j], [0, 1, 2, 3], 2)
    tag = gr.tag_t()
    tag.offset, tag.key, tag.value = 20, halfplane.json_to_pmt('"mark"'), halfplane.json_to_pmt("1")
    source, sink = blocks.vector_source_b([0] * 100, False, 1, [tag]), blocks.vector_sink_c()
    graph = gr.top_block()
    graph.connect(source, halfplane.point_mapper(which, "bits"), sink)
    graph.run()
    assert [t.offset for t in sink.tags()] == [10]
