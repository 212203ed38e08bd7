# SPDX-License-Identifier: GPL-3.0-or-later
"""
A set of one's own with unequal priors: a sensor of the Firn line that mostly has nothing to say, and then sends silence.

    test_pattern → point_mapper → noise_at → aligner → link_watch → link_log

Points, labels and priors stand in a set file; every block and every command takes the same file. Unequal priors mean a
MAP detector, here and in the predicted rates. Prints the last report.
"""

from pathlib import Path

from gnuradio import blocks, gr, halfplane

SET_FILE = Path(__file__).parents[1] / "sets" / "firn-9-quiet.json"


class OwnSet(gr.top_block):
    """`symbols` symbols at `es_n0_db`; reports go to the file `log`, if one is named."""

    def __init__(self, signal_set, es_n0_db=10.0, symbols=200_000, log=None):
        super().__init__("A set of one's own")
        # Draws by prior: no sequence of bits could send silence four times in ten.
        pattern = "draw:11"
        noise = halfplane.noise_at(signal_set, es_n0_db)
        aligner = halfplane.aligner(signal_set, pattern)
        self.watch = halfplane.link_watch(signal_set, pattern)
        self.connect(
            halfplane.test_pattern(signal_set, pattern),
            blocks.head(gr.sizeof_short, symbols),
            halfplane.point_mapper(signal_set),
            noise,
            aligner,
            self.watch,
        )
        self.connect((aligner, 1), (self.watch, 1))
        self.msg_connect(noise, "input", self.watch, "input")
        if log is not None:
            self.log = halfplane.link_log(str(log))
            self.msg_connect(self.watch, "report", self.log, "report")


if __name__ == "__main__":
    link = OwnSet(halfplane.load_set(str(SET_FILE)))
    link.run()
    print(link.watch.report())
