# SPDX-License-Identifier: GPL-3.0-or-later
"""A link with ideal timing for the tests: long pulses, faults put in where a test wants them, the final report out."""

import json
import pathlib
import os

import numpy as np
from gnuradio import blocks, filter as gr_filter, gr, halfplane

SOURCE = pathlib.Path(os.environ["HALFPLANE_SOURCE_DIR"])
FIRN = str(SOURCE / "examples" / "sets" / "firn-12.json")
SAMPLES_PER_SYMBOL = 5
PULSE_SYMBOLS = 200
FILL = PULSE_SYMBOLS


class wrong(gr.sync_block):
    """A fault: `what(samples, first)` makes of each stretch of symbols what a bad receiver would."""

    def __init__(self, what):
        gr.sync_block.__init__(self, "wrong", [np.complex64], [np.complex64])
        self.what = what
        self.at = 0

    def work(self, input_items, output_items):
        count = len(output_items[0])
        output_items[0][:] = self.what(input_items[0][:count].copy(), self.at + np.arange(count))
        self.at += count
        return count


class tap(gr.sync_block):
    """Keeps what goes by: the samples and references that link_watch is given."""

    def __init__(self):
        gr.sync_block.__init__(self, "tap", [np.complex64, np.int16], None)
        self.samples, self.reference = [], []

    def work(self, input_items, output_items):
        self.samples.append(input_items[0].copy())
        self.reference.append(input_items[1].copy())
        return len(input_items[0])


def pulse_taps():
    """Root raised cosine over PULSE_SYMBOLS, roll-off 0.35: residual interference is asserted below -60 dB in link.py."""
    return gr_filter.firdes.root_raised_cosine(1.0, SAMPLES_PER_SYMBOL, 1.0, 0.35, PULSE_SYMBOLS * SAMPLES_PER_SYMBOL + 1)


def run_link(which, es_n0_db, symbols, *, pattern="draw:1", expected=None, fault=None, correction="running", seed=1,
             shaped=False, window=10000, log=None, amplitude=1.0):
    """
    One run: report, samples, references. `fault` acts on the received symbols behind the noise; `expected` is the
    receiver's pattern where it is not the sender's.
    """
    source = [halfplane.test_pattern(which, pattern), blocks.head(gr.sizeof_short, symbols), halfplane.point_mapper(which)]
    if shaped:
        taps = pulse_taps()
        noise = halfplane.noise_at(which, es_n0_db, taps, seed)
        energy = halfplane.noise_at.energy(taps)
        chain = [gr_filter.interp_fir_filter_ccf(SAMPLES_PER_SYMBOL, taps), noise,
                 gr_filter.fir_filter_ccf(SAMPLES_PER_SYMBOL, [t / energy for t in taps]),
                 # the two filters filling up: no symbols yet
                 blocks.skiphead(gr.sizeof_gr_complex, FILL)]
    else:
        noise = halfplane.noise_at(which, es_n0_db, 1.0, seed)
        chain = [noise]
    if fault:
        chain.append(wrong(fault))
    aligner = halfplane.aligner(which, expected or pattern, correction)
    watch = halfplane.link_watch(which, expected or pattern, window)
    ear = tap()
    graph = gr.top_block()
    graph.connect(*source, *chain, aligner, watch)
    graph.connect((aligner, 1), (watch, 1))
    graph.connect(aligner, ear)
    graph.connect((aligner, 1), (ear, 1))
    graph.msg_connect(noise, "input", watch, "input")
    if log:
        log = halfplane.link_log(str(log))
        graph.msg_connect(watch, "report", log, "report")
    graph.run()
    report = json.loads(watch.report())
    return report, np.concatenate(ear.samples or [[]]), np.concatenate(ear.reference or [[]]).astype(int)


def assert_account_adds_up(report, symbols):
    """in = judged + nonfinite + pending + excluded, to the symbol, and `in` is what went in."""
    total = report["total"]
    assert total["in"] == symbols
    assert total["in"] == total["judged"] + total["nonfinite"] + total["pending"] + sum(total["excluded"].values())


def counted(which, samples, reference):
    """Independent count over what link_watch was given: judged symbols, symbol errors, bit errors, in numpy."""
    judged = (reference >= 0) & np.isfinite(samples)
    points, labels = np.array(which.points), np.array(which.labels)
    sent, received = reference[judged], samples[judged].astype(complex)
    decided = np.argmin(np.abs(received[:, None] - points), axis=1)
    bit_errors = sum(bin(int(a) ^ int(b)).count("1") for a, b in zip(labels[sent], labels[decided]))
    return len(sent), int(np.sum(sent != decided)), bit_errors
