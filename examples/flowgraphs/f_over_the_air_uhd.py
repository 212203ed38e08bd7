# SPDX-License-Identifier: GPL-3.0-or-later
"""
Over the air with a radio that UHD drives: a pattern out, the report back in.

    test_pattern → point_mapper → shaping → back-off → radio … radio → matched filter → level → timing → aligner → link_watch

Before you transmit: cable and attenuators first (60 dB or more between the ports), then a dummy load. On air only in a
band and at a power that you are licensed for, at a safe distance from people, and by the law of the place, which stands
above anything said here. Never overdrive an input. Nothing is sent until --permitted says that all this is seen to.
"""

import argparse

import numpy as np
from gnuradio import analog, blocks, digital, gr, halfplane
from gnuradio import filter as gr_filter
from gnuradio.filter import firdes

SAMPLES_PER_SYMBOL = 4
BACK_OFF = 0.1  # of full scale, at the outermost point


class AirLink(gr.top_block):
    """
    One radio as sender and receiver.

    signal_set, pattern: what is sent. radio_out, radio_in: blocks that take and give complex samples. symbol_rate: Hz.
    permitted: zeros are sent unless it is true. log: path of a file for reports, or None.
    """

    def __init__(self, signal_set, pattern, radio_out, radio_in, symbol_rate, permitted=False, log=None):
        super().__init__("Firn line, over the air")
        pulse = firdes.root_raised_cosine(1.0, SAMPLES_PER_SYMBOL, 1.0, 0.35, 22 * SAMPLES_PER_SYMBOL + 1)
        energy = halfplane.noise_at.energy(pulse)
        outermost = float(np.max(np.abs(signal_set.points)))
        self.watch = halfplane.link_watch(signal_set, pattern, symbol_rate=symbol_rate)
        aligner = halfplane.aligner(signal_set, pattern, symbol_rate=symbol_rate)
        self.connect(
            halfplane.test_pattern(signal_set, pattern),
            halfplane.point_mapper(signal_set),
            gr_filter.interp_fir_filter_ccf(SAMPLES_PER_SYMBOL, pulse),
            blocks.multiply_const_cc(BACK_OFF / outermost if permitted else 0),
            radio_out,
        )
        self.connect(
            radio_in,
            gr_filter.fir_filter_ccf(1, [tap / energy for tap in pulse]),
            analog.agc_cc(3e-4, 1.0, 1.0),
            digital.symbol_sync_cc(
                digital.TED_GARDNER, SAMPLES_PER_SYMBOL, 0.02, 1.0, 1.0, 0.05, 1,
                digital.constellation_bpsk().base(), digital.IR_MMSE_8TAP,
            ),  # fmt: skip
            aligner,
            self.watch,
        )
        self.connect((aligner, 1), (self.watch, 1))
        if log is not None:
            self.log = halfplane.link_log(str(log))
            self.msg_connect(self.watch, "report", self.log, "report")


def command_line(description, **device):
    """What both radios ask for; `device` names the option that says which radio."""
    parser = argparse.ArgumentParser(description=description)
    for name, text in device.items():
        parser.add_argument(f"--{name}", default="", help=text)
    parser.add_argument("--set", default="apsk:4+8:2.3", help="constellation: a set file or a name (default %(default)s)")
    parser.add_argument("--pattern", default="draw:2026", help="default %(default)s")
    parser.add_argument("--frequency", type=float, required=True, help="Hz: one that you may use")
    parser.add_argument("--symbol-rate", type=float, default=250e3, help="Hz (default %(default)g)")
    parser.add_argument("--send-gain", type=float, default=0, help="dB (default %(default)g)")
    parser.add_argument("--receive-gain", type=float, default=0, help="dB (default %(default)g)")
    parser.add_argument("--log", help="file for the reports")
    parser.add_argument("--permitted", action="store_true", help="licence, band, power, attenuation and distance are seen to")
    return parser.parse_args()


def run_until_enter(link):
    """Starts, waits for the Enter key, stops, prints the last report."""
    link.start()
    try:
        input("Enter ends the run: ")
    except (EOFError, KeyboardInterrupt):
        pass
    link.stop()
    link.wait()
    print(link.watch.report())


def uhd_radio(arguments):
    """Sink and source of one device."""
    from gnuradio import uhd

    stream = uhd.stream_args(cpu_format="fc32", channels=[0])
    out, back = uhd.usrp_sink(arguments.device, stream), uhd.usrp_source(arguments.device, stream)
    for end, gain, antenna in ((out, arguments.send_gain, "TX/RX"), (back, arguments.receive_gain, "RX2")):
        end.set_samp_rate(arguments.symbol_rate * SAMPLES_PER_SYMBOL)
        end.set_center_freq(arguments.frequency, 0)
        end.set_gain(gain, 0)
        end.set_antenna(antenna, 0)
    return out, back


if __name__ == "__main__":
    wanted = command_line("The Firn line over the air, by UHD.", device="device arguments of UHD, e.g. serial=…")
    run_until_enter(
        AirLink(
            halfplane.load_set(wanted.set), wanted.pattern, *uhd_radio(wanted), wanted.symbol_rate, wanted.permitted, wanted.log
        )
    )
