# SPDX-License-Identifier: GPL-3.0-or-later
"""test_pattern against sequences worked out here from ITU-T O.150 and from the definition of a draw."""

import numpy as np
import pytest
from gnuradio import blocks, gr, halfplane

from graph import AWKWARD_CHUNKS


def indices(block, count, chunk=None):
    """The first `count` indices of a pattern block."""
    head, sink = blocks.head(gr.sizeof_short, count), blocks.vector_sink_s()
    if chunk:
        block.set_max_noutput_items(chunk)
    graph = gr.top_block()
    graph.connect(block, head, sink)
    graph.run()
    return np.array(sink.data())


def set_of(bits):
    """2^bits points under shuffled labels."""
    labels = np.random.default_rng(bits).permutation(2**bits)
    return halfplane.signal_set(list(range(2**bits)), [int(label) for label in labels], bits), labels


# ITU-T O.150 (05/96), clause 5: stages, feedback stage, inverted output. 20 stages: x^20 + x^3 + 1 (O.151's).
SEQUENCES = [(9, 5, False), (11, 9, False), (15, 14, True), (20, 3, False), (23, 18, True), (29, 27, True), (31, 28, True)]


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
@pytest.mark.parametrize("stages, tap, inverted", SEQUENCES)
@pytest.mark.parametrize("label_bits", [1, 3, 4])
def test_shift_register_sequences(label_bits, stages, tap, inverted, chunk):
    which, labels = set_of(label_bits)
    sent = labels[indices(halfplane.test_pattern(which, f"o150:{stages}"), 3000, chunk)]
    # leftmost bit of a label first
    bits = ((sent[:, None] >> np.arange(label_bits)[::-1]) & 1).ravel() ^ inverted
    assert np.array_equal(bits[stages:], bits[:-stages] ^ bits[stages - tap:-tap])
    assert 0.4 < bits.mean() < 0.6


def draw(seed, priors, count):
    """Symbols of a draw: SplitMix64 (Steele, Lea, Flood, OOPSLA 2014), upper 32 bits against cumulated priors."""
    mask = 2**64 - 1
    bounds = [int(np.floor(2**32 * c)) for c in np.cumsum(priors)]
    bounds[-1] = 2**32
    state, out = seed, []
    for _ in range(count):
        state = (state + 0x9E3779B97F4A7C15) & mask
        z = state
        z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9 & mask
        z = (z ^ (z >> 27)) * 0x94D049BB133111EB & mask
        u = (z ^ (z >> 31)) >> 32
        out.append(next(i for i, bound in enumerate(bounds) if u < bound))
    return np.array(out)


@pytest.mark.parametrize("seed", [0, 7, 2**64 - 1])
def test_draws_by_prior(seed):
    priors = [0.5, 0.25, 0.125, 0.0625, 0.0625]  # exact in binary
    which = halfplane.signal_set([0, 1, 2, 3, 4], [0, 1, 2, 3, 4], 3, priors)
    block = halfplane.test_pattern(which, f"draw:{seed}:1000")
    assert block.period() == 1000
    got = indices(block, 2500, 77)
    once = draw(seed, priors, 1000)
    assert np.array_equal(got, np.concatenate([once, once, once[:500]]))


def test_file(tmp_path):
    which, labels = set_of(2)
    path = tmp_path / "known.txt"
    path.write_text("0 3 1\n2\n")
    assert np.array_equal(indices(halfplane.test_pattern(which, f"file:{path}"), 9), [0, 3, 1, 2, 0, 3, 1, 2, 0])
    path.write_text("0011\n10\n")
    expected = [list(labels).index(label) for label in (0, 3, 2)]
    assert np.array_equal(indices(halfplane.test_pattern(which, f"file:{path}"), 6), expected * 2)


@pytest.mark.parametrize("text, named", [
    ("o150:10", "10"), ("o150:", "o150"), ("draw:x", "x"), ("noise", "noise"), ("", ""), ("file:/nowhere/at/all", "/nowhere/at/all"),
])
def test_refused(text, named):
    which, _ = set_of(2)
    with pytest.raises(ValueError) as refusal:
        halfplane.test_pattern(which, text)
    assert named in str(refusal.value)


def test_bits_need_a_point_for_every_label():
    which = halfplane.signal_set([0, 1, 2], [0, 1, 2], 2)
    with pytest.raises(ValueError):
        halfplane.test_pattern(which, "o150:9")
