# SPDX-License-Identifier: GPL-3.0-or-later
"""input_gauge in a flowgraph: beside a receiver that adds noise of its own, and the dB which that costs in the report."""

import json

import numpy as np
import pmt
import pytest
from gnuradio import blocks, filter as gr_filter, gr, halfplane
from gnuradio.filter import firdes

from graph import AWKWARD_CHUNKS

RATE, SYMBOLS_PER_SECOND, PER_SYMBOL = 4e5, 1e5, 4
BAND = (-7e4, 7e4)  # roll-off 0.35
NOISE_BAND = (1e5, 1.9e5)
SPAN = 33  # symbols of the pulse


def pulse():
    taps = np.array(firdes.root_raised_cosine(1, PER_SYMBOL, 1, 0.35, SPAN * PER_SYMBOL))
    return (taps / np.sqrt(np.sum(taps**2))).tolist()


def signal(es_n0_db, count, seed=1):
    """16-QAM of unit energy a symbol in noise, at four samples a symbol; made by numpy alone."""
    rng = np.random.default_rng(seed)
    levels = np.array([-3, -1, 1, 3]) / np.sqrt(10)
    symbols = rng.choice(levels, count) + 1j * rng.choice(levels, count)
    sparse = np.zeros(count * PER_SYMBOL, complex)
    sparse[::PER_SYMBOL] = symbols
    sent = np.convolve(sparse, pulse())
    n0 = 10 ** (-es_n0_db / 10)
    return (sent + np.sqrt(n0 / 2) * (rng.normal(size=len(sent)) + 1j * rng.normal(size=len(sent)))).astype(np.complex64)


def run(samples, chunk=None, tags=(), **options):
    block = halfplane.input_gauge(RATE, SYMBOLS_PER_SECOND, BAND, **{"noise_band": NOISE_BAND, "interval": 0.25, **options})
    if chunk:
        block.set_max_noutput_items(chunk)
    source = blocks.vector_source_c(samples.tolist(), False, 1, tags)
    debug = blocks.message_debug()
    graph = gr.top_block()
    graph.connect(source, block)
    graph.msg_connect(block, "input", debug, "store")
    graph.run()
    return [pmt.to_python(debug.get_message(k)) for k in range(debug.num_messages())], block


@pytest.mark.parametrize("es_n0_db", [5.0, 25.0])
def test_messages_tell_es_n0(es_n0_db):
    messages, block = run(signal(es_n0_db, 80000))
    assert len(messages) == 3  # of 100,000 samples each, the rest too short
    for message in messages:
        assert message["source"] == "measured"
        assert message["es_n0_db_se"] < 0.1
        assert abs(message["es_n0_db"] - es_n0_db) < 4.5 * message["es_n0_db_se"] + 0.02
    assert abs(np.mean([m["es_n0_db"] for m in messages]) - es_n0_db) < 0.1
    assert json.loads(block.reading()) == messages[-1]


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS[1:])
def test_any_chunks_say_the_same(chunk):
    samples = signal(12.0, 8000)[: 8000 * PER_SYMBOL]
    options = {"interval": 0.04, "segments": 100}
    assert run(samples, chunk, **options)[0] == run(samples, None, **options)[0] != []


def tag(offset, word):
    made = gr.tag_t()
    made.offset, made.key, made.value = offset, pmt.intern("transmitter"), pmt.intern(word)
    return made


def test_a_quiet_stretch_instead_of_a_noise_band():
    rng = np.random.default_rng(5)
    quiet = (np.sqrt(0.5 * 10**-1.5) * (rng.normal(size=100000) + 1j * rng.normal(size=100000))).astype(np.complex64)
    samples = np.concatenate([signal(15.0, 30000, 2), quiet, signal(15.0, 60000, 3)])
    start = len(samples) - len(signal(15.0, 60000, 3)) - len(quiet)
    messages, _ = run(samples, noise_band=[], tags=[tag(start, "off"), tag(start + len(quiet), "on")])
    # The first interval knows nothing of the noise; two and a half follow, of which the first began before it.
    assert len(messages) == 2
    for message in messages:
        assert abs(message["es_n0_db"] - 15) < 4.5 * message["es_n0_db_se"] + 0.02


def test_nonfinite_samples_are_counted():
    samples = signal(12.0, 80000)
    samples[5000:5010] = np.nan
    messages, block = run(samples)
    assert block.nonfinite() == messages[-1]["nonfinite"] == 10
    assert all(abs(m["es_n0_db"] - 12) < 0.2 for m in messages)


@pytest.mark.parametrize("change, text", [
    ({"band": (1, 2, 3)}, "input_gauge: band is 3; numbers in it; low and high in Hz are wanted"),
    ({"band": (-1e4, 1e4)}, "input_gauge: band is 20000 Hz wide; a signal of 100000 symbols a second fills more"),
    ({"noise_band": (0, 1e5)}, "input_gauge: noise_band 0 … 100000 Hz overlaps band -70000 … 70000 Hz"),
    ({"interval": 0}, "input_gauge: interval is 0; seconds > 0 are wanted"),
    ({"segments": 10}, "input_gauge: segments is 10; at least 64 are wanted"),
    ({"sample_rate": float("nan")}, "input_gauge: sample_rate is nan; a finite number of Hz above 0 is wanted"),
])
def test_refusals(change, text):
    options = {"sample_rate": RATE, "symbol_rate": SYMBOLS_PER_SECOND, "band": BAND, "noise_band": NOISE_BAND, **change}
    with pytest.raises(ValueError) as refused:
        halfplane.input_gauge(**options)
    assert str(refused.value) == text


def test_what_the_receiver_costs_stands_in_the_report():
    """Noise that the receiver adds behind the gauge: N0 three times as large is 4.77 dB, all of it `excess_noise`."""
    which = halfplane.load_set("qam:16")
    es_n0_db, symbols = 19.0, 400000
    taps = pulse()
    n0 = which.es / 10 ** (es_n0_db / 10)
    pattern = halfplane.test_pattern(which, "draw:5")
    graph = gr.top_block()
    head = blocks.head(gr.sizeof_short, symbols)
    channel = halfplane.noise_at(which, es_n0_db, taps, 7)
    gauge = halfplane.input_gauge(RATE, SYMBOLS_PER_SECOND, BAND, NOISE_BAND, 0.25)
    own_noise = halfplane.noise_at(2 * n0, 0.0, 1.0, 8)  # adds variance 2 N0 a sample
    aligner = halfplane.aligner(which, "draw:5")
    watch = halfplane.link_watch(which, "draw:5")
    graph.connect(pattern, head, halfplane.point_mapper(which), gr_filter.interp_fir_filter_ccf(PER_SYMBOL, taps), channel)
    graph.connect(channel, gauge)
    graph.connect(channel, own_noise, gr_filter.fir_filter_ccf(PER_SYMBOL, taps), aligner)
    graph.connect((aligner, 0), (watch, 0))
    graph.connect((aligner, 1), (watch, 1))
    graph.msg_connect(gauge, "input", watch, "input")
    graph.run()
    report = json.loads(watch.report())
    assert report["input"]["source"] == "measured"
    assert abs(report["input"]["es_n0_db"] - es_n0_db) < 0.1
    assert 0 < report["input"]["es_n0_db_se"] < 0.1
    shortfall = report["shortfall"]["input"]
    print(report["input"], shortfall, report["losses"])
    assert shortfall["db_low"] < 10 * np.log10(3) < shortfall["db_high"]
    assert abs(shortfall["db"] - 10 * np.log10(3)) < 0.2
    rows = {row["cause"]: row["cost_db"] for row in report["losses"]}
    assert abs(rows["excess_noise"] - 10 * np.log10(3)) < 0.3
    assert abs(report["shortfall"]["decision"]["db"]) < 0.1  # the points are as good as their own N0 permits
