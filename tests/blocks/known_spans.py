# SPDX-License-Identifier: GPL-3.0-or-later
"""known_spans in a flowgraph: spans from tags and messages at their exact symbol, late ones, wrong ones, the end of the stream."""

import time

import numpy as np
import pmt
import pytest
from gnuradio import blocks, gr, halfplane

from graph import AWKWARD_CHUNKS

LIVE = -5  # the codes as symbol_code.h promises them
DECODED = 4096
SET = "qam:16"
VECTORS = {np.uint8: pmt.init_u8vector, np.int8: pmt.init_s8vector, np.uint16: pmt.init_u16vector,
           np.int16: pmt.init_s16vector, np.uint32: pmt.init_u32vector, np.int32: pmt.init_s32vector}


def vector(indices, kind=np.int16):
    return VECTORS[kind](len(indices), [int(i) for i in indices])


def tag(offset, value, key="known"):
    made = gr.tag_t()
    made.offset, made.key, made.value = offset, pmt.intern(key), value
    return made


def fields(**values):
    made = pmt.make_dict()
    for name, value in values.items():
        made = pmt.dict_add(made, pmt.intern(name), value)
    return made


def pdu(first_symbol, indices, decoded=None):
    meta = fields(first_symbol=pmt.from_uint64(first_symbol))
    if decoded is not None:
        meta = pmt.dict_add(meta, pmt.intern("decoded"), pmt.from_bool(decoded))
    return pmt.cons(meta, vector(indices))


def samples_of(count):
    return (np.arange(count) + 1j).astype(np.complex64)


def run(count, tags=(), messages=(), chunk=None, **options):
    """Messages stand in the queue before the start. References, tags of output 0 and of output 1, the block's counts."""
    block = halfplane.known_spans(halfplane.load_set(SET), **options)
    if chunk:
        block.set_max_noutput_items(chunk)
    for message in messages:
        block.to_basic_block()._post(pmt.intern("known"), message)
    samples = samples_of(count)
    passed, reference = blocks.vector_sink_c(), blocks.vector_sink_s()
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c(samples.tolist(), False, 1, list(tags)), block, passed)
    graph.connect((block, 1), reference)
    graph.run()
    assert np.array_equal(np.array(passed.data(), dtype=np.complex64), samples)
    codes = np.array(reference.data(), dtype=int)
    assert_counts_are_those_of(codes, count, block.counts())
    return codes, passed.tags(), reference.tags(), block.counts()


def assert_counts_are_those_of(codes, count, counts):
    assert len(codes) == count == counts["known"] + counts["decoded"] + counts["live"]
    assert counts["known"] == np.sum((codes >= 0) & (codes < DECODED))
    assert counts["decoded"] == np.sum(codes >= DECODED)
    assert counts["live"] == np.sum(codes == LIVE)


def named(tags, key):
    return [(t.offset, pmt.to_python(t.value)) for t in tags if pmt.symbol_to_string(t.key) == key]


def expected(count, *spans):
    made = np.full(count, LIVE)
    for first, indices, decoded in spans:
        made[first:first + len(indices)] = np.asarray(indices) + (DECODED if decoded else 0)
    return made


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
@pytest.mark.parametrize("hold_back", [0, 1, 100, 4096])
def test_tags_at_any_symbol_in_any_chunk(chunk, hold_back):
    count = 10000 if chunk != 1 else 5000
    spans = [(0, [3], False), (1, [4, 5], True), (1022, np.arange(16), False), (1023 + 16, [1] * 7, False),
             (4095, [2] * 300, True), (count - 2, [6, 7], False)]
    tags = [tag(first, fields(indices=vector(indices), decoded=pmt.from_bool(decoded)) if decoded else vector(indices))
            for first, indices, decoded in spans]
    codes, _, _, counts = run(count, tags, chunk=chunk, hold_back=hold_back)
    assert np.array_equal(codes, expected(count, *spans))
    assert (counts["spans"], counts["conflicts"], counts["late"], counts["early"], counts["refused"]) == (6, 0, 0, 0, 0)


@pytest.mark.parametrize("count", [0, 1, 99, 100, 101, 20000])
@pytest.mark.parametrize("chunk", [None, 77])
def test_nothing_is_lost_where_the_input_ends(count, chunk):
    _, tags, more_tags, _ = run(count, chunk=chunk, hold_back=100)
    pending = named(tags, "pending")
    assert pending == named(more_tags, "pending")
    if count > 100:
        assert pending[0] == (0, 100)
    if count:
        assert pending[-1][1] == 0


def test_other_tags_keep_their_symbol():
    places = (0, 1, 99, 100, 5000, 9999)
    marks = [tag(k, pmt.from_uint64(k), "rx_time") for k in places] + [tag(k, vector([1])) for k in places]
    _, tags, more_tags, _ = run(10000, marks, chunk=77, hold_back=100)
    assert named(tags, "rx_time") == [(k, k) for k in places]
    assert not named(more_tags, "rx_time") and not named(tags, "known")


def test_another_key():
    codes, tags, _, counts = run(100, [tag(5, vector([1]), "preamble"), tag(6, vector([2]))], tag_key="preamble")
    assert np.array_equal(codes, expected(100, (5, [1], False)))
    assert [offset for offset, _ in named(tags, "known")] == [6]  # a tag like any other


@pytest.mark.parametrize("kind", VECTORS)
def test_vectors_of_any_width(kind):
    codes, *_ = run(50, [tag(10, vector([0, 15, 7], kind))], [pmt.cons(fields(first_symbol=pmt.from_long(20)), vector([9, 8], kind))])
    assert np.array_equal(codes, expected(50, (10, [0, 15, 7], False), (20, [9, 8], False)))


def test_messages_ahead_of_their_symbols_and_both_ways_together():
    """A preamble by tag, its frame by message: what is known in advance outranks what was decoded."""
    frame = np.arange(200) % 16
    for decoded in (None, False, True):
        codes, _, _, counts = run(3000, [tag(1000, vector(frame[:64]))], [pdu(1000, frame, decoded)], hold_back=500)
        assert np.array_equal(codes[1000:1064], frame[:64])
        assert np.array_equal(codes[1064:1200], frame[64:] + (DECODED if decoded else 0))
        assert counts["known"] == (64 if decoded else 200)


def test_what_contradicts_is_left_out_and_told(capfd):
    tags = [tag(100, vector([1, 2, 3])), tag(102, vector([4, 5])), tag(200, vector([6]))]
    codes, _, _, counts = run(1000, tags)
    assert np.array_equal(codes, expected(1000, (100, [1, 2, 3], False), (200, [6], False)))
    assert (counts["spans"], counts["conflicts"]) == (3, 1)
    told = "".join(capfd.readouterr())
    assert "1 spans contradict earlier ones" in told


def test_what_went_wrong_last_is_told_at_the_end(capfd):
    """Within the second after the log was last due."""
    run(20000, [tag(15000, vector([1])), tag(15000, vector([2]))], chunk=77)
    assert "1 spans contradict earlier ones" in "".join(capfd.readouterr())


class holding(gr.sync_block):
    """Lets `first` samples through and the others once it is told to."""

    def __init__(self, first):
        gr.sync_block.__init__(self, "holding", [np.complex64], [np.complex64])
        self.first, self.open, self.passed = first, False, 0

    def work(self, input_items, output_items):
        count = len(output_items[0])
        if not self.open:
            count = min(count, self.first - self.passed)
            if count == 0:
                time.sleep(0.001)
                return 0
        output_items[0][:count] = input_items[0][:count]
        self.passed += count
        return count


def test_late_messages_are_counted_exactly(capfd):
    """900 symbols have come out when the message comes; it covers 880 … 919."""
    block = halfplane.known_spans(halfplane.load_set(SET), hold_back=100)
    gate = holding(1000)
    passed, reference = blocks.vector_sink_c(), blocks.vector_sink_s()
    heard = blocks.message_debug()
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c(samples_of(3000).tolist()), gate, block, passed)
    graph.connect((block, 1), reference)
    graph.msg_connect(block, "spans", heard, "store")
    graph.start()
    until(lambda: block.nitems_read(0) == 1000)
    block.to_basic_block()._post(pmt.intern("known"), pdu(880, [5] * 40, True))
    until(lambda: block.counts()["spans"] == 1)
    time.sleep(1.1)  # the counts are told once a second
    gate.open = True
    graph.wait()
    codes = np.array(reference.data(), dtype=int)
    assert np.array_equal(codes, expected(3000, (900, [5] * 20, True)))
    assert_counts_are_those_of(codes, 3000, block.counts())
    assert block.counts()["late"] == 20
    assert "20 symbols came too late for a hold-back of 100" in "".join(capfd.readouterr())
    last = pmt.to_python(heard.get_message(heard.num_messages() - 1))
    assert set(last) == set(block.counts()) and last["late"] == 20 and last["spans"] == 1


def until(condition):
    deadline = time.monotonic() + 30
    while not condition():
        assert time.monotonic() < deadline
        time.sleep(0.005)


OUT_OF_SET = "index 1 of the span at symbol 30 is {}: the set has 16 points"


@pytest.mark.parametrize("value, why", [
    (vector([3, 16]), OUT_OF_SET.format(16)),
    (vector([3, -1]), OUT_OF_SET.format(-1)),
    (vector([3, 70000], np.int32), OUT_OF_SET.format(70000)),
    (vector([3, 255], np.uint8), OUT_OF_SET.format(255)),
    (vector([]), "the span at symbol 30 is empty"),
    (pmt.init_f32vector(2, [1.0, 2.0]), "a vector of integers is wanted"),
    (pmt.intern("1,2,3"), "indices are 1,2,3; a vector of integers is wanted"),
    (pmt.cons(pmt.from_long(1), pmt.from_long(2)), "a vector of integers is wanted"),
    (pmt.PMT_NIL, "indices are missing"),
    (fields(decoded=pmt.PMT_T), "indices are missing"),
    (fields(indices=vector([1]), decoded=pmt.from_long(1)), "decoded is 1; true or false is wanted"),
])
def test_a_wrong_tag_is_named_and_the_stream_goes_on(value, why, capfd):
    codes, _, _, counts = run(100, [tag(30, value), tag(60, vector([1, 2]))])
    assert np.array_equal(codes, expected(100, (60, [1, 2], False)))
    assert (counts["spans"], counts["refused"]) == (1, 1)
    told = "".join(capfd.readouterr())
    assert "the tag `known` at symbol 30 is not understood" in told and why in told


@pytest.mark.parametrize("message, why", [
    (pdu(30, [3, 16]), OUT_OF_SET.format(16)),
    (pmt.cons(fields(decoded=pmt.PMT_T), vector([1])), "first_symbol is missing"),
    (pmt.cons(pmt.PMT_NIL, vector([1])), "first_symbol is missing"),
    (pmt.cons(fields(first_symbol=pmt.from_long(-3)), vector([1])), "first_symbol is -3; an integer ≥ 0 is wanted"),
    (pmt.cons(fields(first_symbol=pmt.from_double(3)), vector([1])), "first_symbol is 3; an integer ≥ 0 is wanted"),
    (pmt.cons(fields(first_symbol=pmt.from_long(3), decoded=pmt.intern("yes")), vector([1])), "decoded is yes; true or false"),
    (pmt.cons(fields(first_symbol=pmt.from_long(3)), pmt.from_long(1)), "indices are 1; a vector of integers is wanted"),
    (vector([1, 2]), "a pair of a dict and a vector of integers is wanted"),
    (pmt.PMT_T, "a pair of a dict and a vector of integers is wanted"),
    (fields(first_symbol=pmt.from_long(3)), "a pair of a dict and a vector of integers is wanted"),
])
def test_a_wrong_message_is_named_and_the_stream_goes_on(message, why, capfd):
    codes, _, _, counts = run(100, messages=[pdu(10, [4]), message, pdu(60, [1, 2])])
    assert np.array_equal(codes, expected(100, (10, [4], False), (60, [1, 2], False)))
    assert (counts["spans"], counts["refused"]) == (2, 1)
    told = "".join(capfd.readouterr())
    assert "message 2 on `known` is not understood" in told and why in told


def test_construction_names_what_is_wrong():
    which = halfplane.load_set(SET)
    with pytest.raises(ValueError, match="hold_back is 16777217; at most 16777216 symbols"):
        halfplane.known_spans(which, hold_back=2**24 + 1)
    with pytest.raises(ValueError, match="tag_key is ''"):
        halfplane.known_spans(which, tag_key="")
    assert halfplane.known_spans(which).hold_back() == 4096
