# SPDX-License-Identifier: GPL-3.0-or-later
"""noise_at: the variance it declares, at the sample and behind a matched filter, and the message that says so."""

import time

import numpy as np
import pmt
import pytest
from gnuradio import blocks, filter as gr_filter, gr, halfplane
from scipy import stats

from graph import AWKWARD_CHUNKS, run_through

QPSK = [1 + 1j, -1 + 1j, -1 - 1j, 1 - 1j]  # Es = 2
CONFIDENCE = 1 - 1e-6


def the_set():
    return halfplane.signal_set(QPSK, [0, 1, 3, 2], 2)


def variance_interval(n0, count):
    """Where the mean |w|^2 of `count` CN(0, n0) samples lies: 2 count degrees of freedom."""
    return [n0 * stats.chi2.ppf(q, 2 * count) / (2 * count) for q in ((1 - CONFIDENCE) / 2, (1 + CONFIDENCE) / 2)]


@pytest.mark.parametrize("es_n0_db, pulse", [(0.0, 1.0), (10.0, 1.0), (-20.0, 4.5), (60.0, 0.2), (12.5, [0.5, 1, -0.5])])
def test_variance(es_n0_db, pulse):
    energy = pulse if isinstance(pulse, float) else 1.5  # 0.25 + 1 + 0.25
    block = halfplane.noise_at(the_set(), es_n0_db, pulse, 5)
    n0 = 2 * energy / 10 ** (es_n0_db / 10)
    assert block.n0() == pytest.approx(n0, rel=1e-14)
    noise = run_through(block, np.zeros(200000), "c", "c").astype(complex)
    low, high = variance_interval(n0, len(noise))
    assert low < np.mean(np.abs(noise) ** 2) < high
    # half in each dimension, the two uncorrelated, no mean: each within six standard errors of a normal mean
    error = n0 / np.sqrt(len(noise))
    assert abs(np.mean(noise**2)) < 6 * error
    assert abs(np.mean(noise)) < 6 * np.sqrt(n0 / len(noise))
    # white: the lag-one correlation likewise
    assert abs(np.mean(noise[1:] * np.conj(noise[:-1]))) < 6 * error


@pytest.mark.parametrize("chunk", AWKWARD_CHUNKS)
def test_the_same_seed_draws_the_same_noise_in_any_chunks(chunk):
    signal = np.exp(1j * np.arange(5003))
    once = run_through(halfplane.noise_at(2.0, 7.0, 1.0, 9), signal, "c", "c")
    again = run_through(halfplane.noise_at(2.0, 7.0, 1.0, 9), signal, "c", "c", chunk)
    assert np.array_equal(once, again)
    other = run_through(halfplane.noise_at(2.0, 7.0, 1.0, 10), signal, "c", "c")
    assert np.mean(other == once) < 0.01


def test_set_and_es_agree():
    signal = np.zeros(100)
    assert np.array_equal(run_through(halfplane.noise_at(the_set(), 3.0), signal, "c", "c"),
                          run_through(halfplane.noise_at(2.0, 3.0), signal, "c", "c"))


def test_es_n0_behind_the_matched_filter():
    """Single pulses far apart, so that each is seen alone: symbol and noise at the filter's output give Es/N0 itself."""
    taps = gr_filter.firdes.root_raised_cosine(3.0, 5, 1, 0.35, 111)  # not of unit energy
    energy = halfplane.noise_at.energy(taps)
    assert energy == pytest.approx(np.sum(np.square(taps)), rel=1e-12) and abs(energy - 1) > 0.1
    spacing, count, es_n0_db = 250, 4000, 8.0
    symbols = np.zeros(spacing * count, dtype=complex)
    sent = np.array(QPSK)[np.random.default_rng(2).integers(4, size=count)]
    symbols[::spacing] = sent
    source, sink = blocks.vector_source_c(symbols.tolist()), blocks.vector_sink_c()
    graph = gr.top_block()
    graph.connect(source, gr_filter.fir_filter_ccf(1, taps), halfplane.noise_at(the_set(), es_n0_db, taps, 3),
                  gr_filter.fir_filter_ccf(1, taps[::-1]), sink)
    graph.run()
    peaks = np.array(sink.data())[len(taps) - 1::spacing] / energy  # (taps * reversed taps) peaks at their energy
    sent = sent[:len(peaks)]
    noise = peaks - sent
    low, high = variance_interval(2 / 10 ** (es_n0_db / 10), len(noise))
    assert low < np.mean(np.abs(noise) ** 2) < high


class listener(gr.sync_block):
    """Writes down messages of port `input` and the first samples, in the order in which they come."""

    def __init__(self):
        gr.sync_block.__init__(self, "listener", [np.complex64], None)
        self.seen = []
        self.message_port_register_in(pmt.intern("input"))
        self.set_msg_handler(pmt.intern("input"), self.hear)

    def hear(self, message):
        self.seen.append(pmt.to_python(message))

    def work(self, input_items, output_items):
        if "samples" not in self.seen:
            self.seen.append("samples")
        return len(input_items[0])


def declared(es_n0_db):
    return {"es_n0_db": es_n0_db, "es_n0_db_se": 0.0, "source": "declared"}


def test_the_message_comes_before_the_first_sample():
    """Fifty runs: a message lost once in twenty would pass with a chance of 8 %, once in ten with 0.5 %."""
    for run in range(50):
        noise, ear = halfplane.noise_at(the_set(), 4.5), listener()
        graph = gr.top_block()
        graph.connect(blocks.vector_source_c([0] * 2000), noise, ear)
        graph.msg_connect(noise, "input", ear, "input")
        graph.run()
        assert ear.seen == [declared(4.5), "samples"], run


def test_a_change_is_declared_and_takes_effect():
    noise, ear, sink = halfplane.noise_at(2.0, 0.0), listener(), blocks.vector_sink_c()
    head = blocks.head(gr.sizeof_gr_complex, 300000)
    graph = gr.top_block()
    graph.connect(blocks.null_source(gr.sizeof_gr_complex), blocks.throttle(gr.sizeof_gr_complex, 1e6), noise, head, sink)
    graph.connect(head, ear)
    graph.msg_connect(noise, "input", ear, "input")
    graph.start()
    while noise.nitems_written(0) < 50000:
        time.sleep(0.001)
    noise.set_es_n0_db(40.0)
    graph.wait()
    assert [message for message in ear.seen if message != "samples"] == [declared(0.0), declared(40.0)]
    assert noise.es_n0_db() == 40.0 and noise.n0() == pytest.approx(2e-4)
    power = np.abs(np.array(sink.data())) ** 2
    low, high = variance_interval(2.0, 20000)
    assert low < np.mean(power[:20000]) < high
    low, high = variance_interval(2e-4, 20000)
    assert low < np.mean(power[-20000:]) < high


@pytest.mark.parametrize("arguments, message", [
    ((0.0, 10.0), "es is 0"),
    ((-1.0, 10.0), "es is -1"),
    ((float("nan"), 10.0), "es is nan"),
    ((1.0, float("nan")), "es_n0_db is nan"),
    ((1.0, 201.0), "es_n0_db is 201"),
    ((1.0, 10.0, 0.0), "pulse_energy is 0"),
    ((1.0, 10.0, float("inf")), "pulse_energy is inf"),
    ((1.0, 10.0, []), "energy of the pulse taps is 0"),
    ((1.0, 10.0, [0.0, 0.0]), "energy of the pulse taps is 0"),
    ((1.0, 10.0, [1.0, float("nan")]), "energy of the pulse taps is nan"),
])
def test_refused(arguments, message):
    with pytest.raises(ValueError, match="noise_at: " + message):
        halfplane.noise_at(*arguments)


def test_setter_refuses_and_keeps_what_was():
    block = halfplane.noise_at(1.0, 10.0)
    with pytest.raises(ValueError, match="es_n0_db is -1000"):
        block.set_es_n0_db(-1000)
    assert block.es_n0_db() == 10.0
