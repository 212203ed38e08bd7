# SPDX-License-Identifier: GPL-3.0-or-later
"""
A recording judged in a flowgraph: one sample a symbol from a file, as the command `halfplane judge` does it without one.

    file → aligner → link_watch → link_log

The recording is the Firn line at 14 dB, eight bits a sample; its metadata names set and pattern. Prints the last report, with
the verdict on its symbol error rate.
"""

import json
from pathlib import Path

from gnuradio import blocks, gr, halfplane

RECORDING = Path(__file__).parents[1] / "recordings" / "firn-14db"
FULL_SCALE = 128


class Recording(gr.top_block):
    """All of a `ci8` file against `pattern`; `target` as link_watch takes it."""

    def __init__(self, data, signal_set, pattern, symbol_rate, target="ser:0.02", log=None):
        super().__init__("A recording judged")
        aligner = halfplane.aligner(signal_set, pattern)
        self.watch = halfplane.link_watch(signal_set, pattern, symbol_rate=symbol_rate, target=target)
        self.connect(
            blocks.file_source(gr.sizeof_char, str(data), False),
            blocks.interleaved_char_to_complex(False, FULL_SCALE),
            aligner,
            self.watch,
        )
        self.connect((aligner, 1), (self.watch, 1))
        if log is not None:
            self.log = halfplane.link_log(str(log))
            self.msg_connect(self.watch, "report", self.log, "report")


if __name__ == "__main__":
    known = json.loads(RECORDING.with_suffix(".sigmf-meta").read_text())["global"]
    points = known["halfplane:set"]["points"]
    firn = halfplane.signal_set([p["i"] + 1j * p["q"] for p in points], [p["label"] for p in points], name="firn-12")
    judged = Recording(RECORDING.with_suffix(".sigmf-data"), firn, known["halfplane:pattern"], known["core:sample_rate"])
    judged.run()
    print(judged.watch.report())
