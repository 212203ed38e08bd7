# SPDX-License-Identifier: GPL-3.0-or-later
"""aligner in a flowgraph: the constant hold-back, tags at their exact symbol, lost samples as the radio marks them."""

import time

import numpy as np
import pmt
import pytest
from gnuradio import blocks, gr, halfplane

from graph import AWKWARD_CHUNKS

PATTERN = "draw:5"
HOLDBACK = halfplane.aligner.holdback()


def the_set():
    return halfplane.load_set("qam:16")


def pattern_samples(which, count, first=0, noise=0.02):
    """Symbols `first` … of the pattern with a little noise, and their indices."""
    head, sink = blocks.head(gr.sizeof_short, first + count), blocks.vector_sink_s()
    graph = gr.top_block()
    graph.connect(halfplane.test_pattern(which, PATTERN), head, sink)
    graph.run()
    indices = np.array(sink.data(), dtype=int)[first:]
    rng = np.random.default_rng(1)
    disturbance = noise * (rng.normal(size=count) + 1j * rng.normal(size=count))
    return np.array(which.points)[indices] + disturbance, indices


def tag(offset, key, value):
    made = gr.tag_t()
    made.offset, made.key, made.value = offset, pmt.intern(key), value
    return made


def rx_time(seconds):
    return pmt.make_tuple(pmt.from_uint64(int(seconds)), pmt.from_double(seconds % 1))


def align(samples, tags=(), chunk=None, **options):
    """Output samples, references, tags of output 0 and of output 1, and the block."""
    block = halfplane.aligner(the_set(), PATTERN, **options)
    if chunk:
        block.set_max_noutput_items(chunk)
    source = blocks.vector_source_c(np.asarray(samples).astype(complex).tolist(), False, 1, list(tags))
    corrected, reference = blocks.vector_sink_c(), blocks.vector_sink_s()
    graph = gr.top_block()
    graph.connect(source, block, corrected)
    graph.connect((block, 1), reference)
    graph.run()
    return np.array(corrected.data()), np.array(reference.data()), corrected.tags(), reference.tags(), block


def named(tags, key):
    return [(t.offset, pmt.to_python(t.value)) for t in tags if pmt.symbol_to_string(t.key) == key]


@pytest.mark.parametrize("chunk", [None, 1000])
@pytest.mark.parametrize("count", [0, 1, 3000, HOLDBACK - 1, HOLDBACK, HOLDBACK + 1, 20000])
def test_all_comes_out_where_the_input_ends(count, chunk):
    samples, indices = pattern_samples(the_set(), count)
    corrected, reference, tags, reference_tags, _ = align(samples, chunk=chunk)
    assert len(corrected) == len(reference) == count
    assert np.all((reference == indices) | (reference == -1))
    if count >= 3000:
        assert np.mean(reference[2500:] == indices[2500:]) == 1
    left = named(tags, "pending")
    assert left == named(reference_tags, "pending")
    assert not count or left[-1][1] == 0


def test_holds_back_a_constant_number_while_the_input_goes_on():
    """A source that never ends: what has come out when the flowgraph is stopped is what went in, less the hold-back."""
    samples, _ = pattern_samples(the_set(), 4096)
    block = halfplane.aligner(the_set(), PATTERN)
    probe_in, probe_out = blocks.probe_rate(gr.sizeof_gr_complex), blocks.vector_sink_s()
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c(samples.tolist(), True), blocks.throttle(gr.sizeof_gr_complex, 1e5), block)
    graph.connect(block, probe_in)
    graph.connect((block, 1), probe_out)
    graph.start()
    deadline = time.monotonic() + 30
    while len(probe_out.data()) < 20000 and time.monotonic() < deadline:
        time.sleep(0.05)
    graph.stop()
    graph.wait()
    assert block.nitems_written(0) == block.nitems_read(0) - HOLDBACK


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
def test_chunks_make_no_difference(chunk):
    samples, indices = pattern_samples(the_set(), 12000, first=777)
    corrected, reference, _, _, block = align(samples * 0.4 * np.exp(1.1j), chunk=chunk)
    whole = align(samples * 0.4 * np.exp(1.1j))
    assert np.array_equal(corrected, whole[0]) and np.array_equal(reference, whole[1])
    held = reference >= 0
    assert np.mean(held) > 0.5 and np.array_equal(reference[held], indices[:len(reference)][held])
    assert block.state() == "held" and block.slips() == 0


def test_lock_is_tagged_at_the_first_known_symbol():
    samples, _ = pattern_samples(the_set(), 12000, first=777)
    _, reference, tags, reference_tags, _ = align(samples)
    locks = named(tags, "lock")
    assert locks == named(reference_tags, "lock")
    first_held = next(offset for offset, status in locks if status["state"] == "held")
    assert first_held == np.argmax(reference >= 0)
    assert locks[-1][1]["delay"] == 777
    assert named(tags, "pending")[0] == named(reference_tags, "pending")[0] == (0, HOLDBACK)


def test_tags_of_the_input_keep_their_symbol():
    samples, _ = pattern_samples(the_set(), 12000)
    marks = [tag(offset, "mark", pmt.from_uint64(offset)) for offset in (0, 1, 4095, 4096, 7903)]
    _, _, tags, reference_tags, _ = align(samples, marks, chunk=77)
    assert named(tags, "mark") == [(offset, offset) for offset in (0, 1, 4095, 4096, 7903)]
    assert named(reference_tags, "mark") == []


# 1000 symbols go missing before symbol 10000; the radio's clock says so, at 1000 symbols a second.
@pytest.mark.parametrize("rate, second_tag, lost", [
    (1000.0, 11.0, True),    # as many seconds as symbols, and one more
    (1000.0, 10.0, False),   # the tag fits: nothing is said to be lost
    (1000.0, 10.0005, False),  # half a symbol: the clock's own grain
    (0, 10.0, True),         # rate unknown: a second tag can only mean a loss
])
def test_rx_time_tags(rate, second_tag, lost):
    samples, _ = pattern_samples(the_set(), 31000)
    if lost:
        samples = np.concatenate([samples[:10000], samples[11000:]])
    marks = [tag(0, "rx_time", rx_time(5.0)), tag(10000, "rx_time", rx_time(5.0 + second_tag))]
    _, reference, _, _, block = align(samples, marks, symbol_rate=rate)
    assert np.any(reference == -4) == lost
    assert block.state() == "held"
    if not lost:
        assert np.all(reference[10000 - 100:10000 + 100] >= 0)
    assert np.all(reference[-1000:] >= 0)


def test_overflow_message_is_heard():
    """Posted before the start: it stands in the queue and counts for the first symbols."""
    block = halfplane.aligner(the_set(), PATTERN)
    block.to_basic_block()._post(pmt.intern("overflow"), pmt.PMT_T)
    samples, _ = pattern_samples(the_set(), 20000)
    reference = blocks.vector_sink_s()
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c(samples.tolist()), block, blocks.null_sink(gr.sizeof_gr_complex))
    graph.connect((block, 1), reference)
    graph.run()
    assert np.mean(np.array(reference.data()) >= 0) > 0.8
