# SPDX-License-Identifier: GPL-3.0-or-later
"""
Live traffic in which only the frames' preambles are known: what can be judged of it is, the rest is gauged blindly.

    frames → point_mapper → noise_at ─┬──────────────────→ frame finder → known_spans → link_watch → link_log
                                      └→ point_detector ───────┘   └┄┄┄ known ┄┄┄┘

A frame is a preamble that both ends know, a payload that nobody knows in advance, and a CRC-32. The frame finder, a
block in Python in place of your receiver's own, looks for the preamble among the decisions and says where it stands: a span
known in advance. Where the checksum holds it says what the whole frame was: a span known by decoding.

Decoded frames flatter. Those that failed are missing among them, and it was their errors that made them fail; here, without
an error-correcting code, a frame that passes has no error at all. So the report counts them apart, and what it says of the link
rests on what was known in advance.

The samples pass through the finder, so that it has always spoken before they reach known_spans; the hold-back then need only
cover a frame and one buffer between two blocks. Prints how many frames it found and how many passed, and the last report.
"""

import math
import zlib

import numpy as np
import pmt
from gnuradio import blocks, gr, halfplane

PREAMBLE_SYMBOLS = 64
PAYLOAD_SYMBOLS = 128
HOLD_BACK = 16384


def preamble(points):
    """What every frame begins with: indices below `points`, the size of the set."""
    return np.random.default_rng(PREAMBLE_SYMBOLS).integers(points, size=PREAMBLE_SYMBOLS)


def checksum(payload, points):
    """CRC-32 of the payload, a byte each symbol, as digits to the base `points`, the highest first."""
    rest, digits = zlib.crc32(np.asarray(payload, dtype=np.uint8).tobytes()), []
    for _ in range(math.ceil(32 / math.log2(points))):
        rest, digit = divmod(rest, points)
        digits.append(digit)
    return digits[::-1]


def traffic(points, frames, seed=2026):
    """Indices of so many frames back to back; the receiver comes in amid the first."""
    draw = np.random.default_rng(seed)
    payloads = draw.integers(points, size=(frames, PAYLOAD_SYMBOLS))
    sent = [np.concatenate([preamble(points), payload, checksum(payload, points)]) for payload in payloads]
    return np.concatenate(sent)[77:].tolist()


class FrameFinder(gr.sync_block):
    """
    Looks for frames among decisions and says on port `known` what is known of them; samples pass untouched.

    preamble: its indices. payload_symbols: between preamble and checksum. checksum: function of the payload.
    """

    def __init__(self, preamble=(0,), payload_symbols=1, checksum=lambda payload: [0]):
        gr.sync_block.__init__(self, "Frame Finder", [np.complex64, np.int16], [np.complex64])
        self.preamble = np.asarray(preamble)
        self.payload_symbols = payload_symbols
        self.checksum = checksum
        self.frame_symbols = len(self.preamble) + payload_symbols + len(checksum(np.zeros(payload_symbols, dtype=int)))
        self.decisions = np.zeros(0, dtype=np.int16)  # those still needed
        self.first = 0  # symbol number of the first of them
        self.next = 0  # where a preamble may begin that was not looked at yet
        self.begun = []  # frames whose end has not come
        self.found = self.passed = 0
        self.message_port_register_out(pmt.intern("known"))

    def work(self, input_items, output_items):
        count = len(output_items[0])
        output_items[0][:] = input_items[0][:count]
        self.decisions = np.concatenate([self.decisions, input_items[1][:count]])
        self.look_for_preambles()
        self.check_frames()
        needed = min(self.begun + [self.next])
        self.decisions, self.first = self.decisions[needed - self.first :], needed
        return count

    def look_for_preambles(self):
        """Three decisions in four must agree: at random one in `points` does, so nothing else is taken for one."""
        length = len(self.preamble)
        fresh = self.decisions[self.next - self.first :]
        if len(fresh) < length:
            return
        agreeing = np.sum(np.lib.stride_tricks.sliding_window_view(fresh, length) == self.preamble, axis=1)
        for place in self.next + np.flatnonzero(agreeing >= 0.75 * length):
            self.found += 1
            self.begun.append(int(place))
            self.say(int(place), self.preamble, False)
        self.next += len(agreeing)

    def check_frames(self):
        end = self.first + len(self.decisions)
        while self.begun and self.begun[0] + self.frame_symbols <= end:
            place = self.begun.pop(0)
            frame = self.decisions[place - self.first :][: self.frame_symbols]
            payload, check = np.split(frame[len(self.preamble) :], [self.payload_symbols])
            if np.array_equal(check, self.checksum(payload)):
                self.passed += 1
                # Encoded anew: of the preamble we know better than what was decided.
                self.say(place, np.concatenate([self.preamble, payload, check]), True)

    def say(self, first_symbol, indices, decoded):
        where = pmt.dict_add(pmt.make_dict(), pmt.intern("first_symbol"), pmt.from_uint64(first_symbol))
        where = pmt.dict_add(where, pmt.intern("decoded"), pmt.from_bool(decoded))
        vector = pmt.init_s16vector(len(indices), [int(index) for index in indices])
        self.message_port_pub(pmt.intern("known"), pmt.cons(where, vector))


class LiveTraffic(gr.top_block):
    """`frames` frames over `signal_set` at `es_n0_db`; reports go to the file `log`, if one is named."""

    def __init__(self, signal_set, es_n0_db=14.5, frames=1000, log=None):
        super().__init__("Live traffic, known frames")
        size = signal_set.size
        noise = halfplane.noise_at(signal_set, es_n0_db)
        self.finder = FrameFinder(preamble(size), PAYLOAD_SYMBOLS, lambda payload: checksum(payload, size))
        self.spans = halfplane.known_spans(signal_set, HOLD_BACK)
        self.watch = halfplane.link_watch(signal_set, "preambles and frames that passed")
        self.connect(
            blocks.vector_source_s(traffic(size, frames)),
            halfplane.point_mapper(signal_set),
            noise,
            self.finder,
            self.spans,
            self.watch,
        )
        self.connect(noise, halfplane.point_detector(signal_set), (self.finder, 1))
        self.connect((self.spans, 1), (self.watch, 1))
        self.msg_connect(self.finder, "known", self.spans, "known")
        self.msg_connect(noise, "input", self.watch, "input")
        if log is not None:
            self.log = halfplane.link_log(str(log))
            self.msg_connect(self.watch, "report", self.log, "report")


if __name__ == "__main__":
    link = LiveTraffic(halfplane.load_set("apsk:4+8:2.3"))
    link.run()
    print(f"{link.finder.found} frames found, {link.finder.passed} passed their check")
    print(link.watch.report())
