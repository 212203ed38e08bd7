# SPDX-License-Identifier: GPL-3.0-or-later
"""
Soft bits of any set into the host's convolutional decoder, and the errors that are left behind it.

    bits → host's encoder → point_mapper → noise_at → llr_detector → host's decoder → error_tally
      └───────────────────────────────────────────────────────────────────────────────┘

The ratios of llr_detector are exact; the decoder wants them as bytes, so they are scaled once to the range in which it
tells them apart. Prints the last report of error_tally.
"""

import numpy as np
from gnuradio import blocks, fec, gr, halfplane

FRAME_BITS = 2048
LARGEST_RATIO = 12.0  # nats; what is surer than this is all the same to the decoder


class SoftBits(gr.top_block):
    """`frames` frames of a rate-1/2, constraint-length-7 code over `signal_set` at `es_n0_db`."""

    def __init__(self, signal_set, es_n0_db=9.0, frames=200):
        super().__init__("Soft bits into a decoder")
        coding = fec.cc_encoder_make(FRAME_BITS, 7, 2, [109, 79], 0, fec.CC_STREAMING, False)
        decoding = fec.cc_decoder.make(FRAME_BITS, 7, 2, [109, 79], 0, -1, fec.CC_STREAMING, False)
        encoder = fec.extended_encoder(coding, threading=None, puncpat="11")
        decoder = fec.extended_decoder(decoding, threading=None, ann=None, puncpat="11")
        n0 = signal_set.es / 10 ** (es_n0_db / 10)
        bits = np.random.default_rng(2026).integers(2, size=FRAME_BITS * frames).tolist()
        source = blocks.vector_source_b(bits)
        self.tally = halfplane.error_tally(frame_bits=FRAME_BITS, target="ber:1e-3")
        self.connect(
            source,
            encoder,
            halfplane.point_mapper(signal_set, "bits"),
            halfplane.noise_at(signal_set, es_n0_db),
            halfplane.llr_detector(signal_set, n0, positive=1, saturation=LARGEST_RATIO),
            # The decoder's own scale: 48 steps a unit, 127 on either side.
            blocks.multiply_const_ff(127 / 48 / LARGEST_RATIO),
            decoder,
            (self.tally, 1),
        )
        self.connect(source, (self.tally, 0))


if __name__ == "__main__":
    link = SoftBits(halfplane.load_set("qam:16"))
    link.run()
    print(link.tally.report())
