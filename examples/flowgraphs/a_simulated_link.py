# SPDX-License-Identifier: GPL-3.0-or-later
"""
The Firn line as a flowgraph: sensor data from a slope to a valley hut, with a pattern in place of the data.

    test_pattern → point_mapper → pulse shaping → noise_at → gain, phase, frequency, delay      the slope, the air
    → matched filter → level control → timing → aligner → link_watch → link_log                 the hut

Everything from the matched filter to the timing loop is the host's own; halfplane measures what they make of it.
Run as a program, it sends 200,000 symbols at 14 dB and prints the last report.
"""

import math

import numpy as np
from gnuradio import analog, blocks, digital, gr, halfplane
from gnuradio import filter as gr_filter
from gnuradio.filter import firdes

SAMPLES_PER_SYMBOL = 5
ROLL_OFF = 0.35
PULSE_SYMBOLS = 22  # length of the pulse; what is cut off is far below the noise of this link


class FirnLink(gr.top_block):
    """
    One run at one Es/N0.

    signal_set: what to send. pattern: text, as test_pattern takes it. es_n0_db: at the input of the receiver.
    symbols: how many are to be judged or left out. log: path of a file for reports, or None. seed: of the noise.
    timing_bandwidth: of the timing loop, in radians a symbol as the host counts it; wider follows faster and costs more.
    watch: further options of link_watch.
    """

    GAIN = 0.31  # complex gain of the channel
    PHASE = 0.9  # radians
    FREQUENCY = 2e-5  # cycles a symbol
    DELAY = 1237  # samples
    FRACTION = 0.37  # of a sample

    def __init__(self, signal_set, pattern, es_n0_db, symbols, log=None, seed=1, timing_bandwidth=0.1, window=10000, **watch):
        super().__init__("Firn line")
        pulse = firdes.root_raised_cosine(
            1.0, SAMPLES_PER_SYMBOL, 1.0, ROLL_OFF, PULSE_SYMBOLS * SAMPLES_PER_SYMBOL + 1
        )
        energy = halfplane.noise_at.energy(pulse)
        noise = halfplane.noise_at(signal_set, es_n0_db, energy, seed)
        self.watch = halfplane.link_watch(signal_set, pattern, window=window, **watch)
        self.aligner = halfplane.aligner(signal_set, pattern)

        slope = [
            halfplane.test_pattern(signal_set, pattern),
            # Filters and timing need some to start: sent on top.
            blocks.head(gr.sizeof_short, symbols + 2 * PULSE_SYMBOLS),
            halfplane.point_mapper(signal_set),
            gr_filter.interp_fir_filter_ccf(SAMPLES_PER_SYMBOL, pulse),
            noise,
        ]
        air = [
            blocks.multiply_const_cc(self.GAIN * np.exp(1j * self.PHASE)),
            blocks.rotator_cc(2 * math.pi * self.FREQUENCY / SAMPLES_PER_SYMBOL),
            blocks.delay(gr.sizeof_gr_complex, self.DELAY),
            gr_filter.fir_filter_ccf(1, fractional_delay(self.FRACTION)),
        ]
        hut = [
            gr_filter.fir_filter_ccf(1, [tap / energy for tap in pulse]),
            # The gain of the timing detector goes with the square of the level.
            analog.agc_cc(3e-4, 1.0, 1.0),
            digital.symbol_sync_cc(
                digital.TED_GARDNER, SAMPLES_PER_SYMBOL, timing_bandwidth, 1.0, 1.0, 0.05, 1,
                digital.constellation_bpsk().base(), digital.IR_MMSE_8TAP,
            ),  # fmt: skip
            self.aligner,
        ]
        self.connect(*slope, *air, *hut, self.watch)
        self.connect((self.aligner, 1), (self.watch, 1))
        self.msg_connect(noise, "input", self.watch, "input")
        if log is not None:
            self.log = halfplane.link_log(str(log))
            self.msg_connect(self.watch, "report", self.log, "report")


def fractional_delay(fraction, half=20):
    """Taps that delay by `half` + fraction samples: a sinc under a Kaiser window, flat over the signal's band."""
    k = np.arange(-half, half + 1)
    taps = np.sinc(k - fraction) * np.kaiser(2 * half + 1, 8)
    return (taps / taps.sum()).tolist()


if __name__ == "__main__":
    from pathlib import Path

    link = FirnLink(halfplane.load_set(str(Path(__file__).parents[1] / "sets" / "firn-12.json")), "draw:2026", 14, 200_000)
    link.run()
    print(link.watch.report())
