# SPDX-License-Identifier: GPL-3.0-or-later
"""Small flowgraphs for the tests: one block between a source and a sink, fed in awkward chunks."""

import numpy as np
from gnuradio import blocks, gr

# None: as the scheduler likes it. The others cap what one call of work() may produce.
AWKWARD_CHUNKS = [None, 1, 7, 1023]

SOURCES = {"s": blocks.vector_source_s, "b": blocks.vector_source_b, "c": blocks.vector_source_c}
SINKS = {"s": blocks.vector_sink_s, "b": blocks.vector_sink_b, "c": blocks.vector_sink_c, "f": blocks.vector_sink_f}
TYPES = {"s": np.int16, "b": np.uint8, "c": np.complex64, "f": np.float32}


def as_items(data, kind):
    """A list that the vector sources take."""
    return np.asarray(data).astype({"s": int, "b": int, "c": complex}[kind]).tolist()


def run_through(block, data, kind_in, kind_out, chunk=None):
    """Everything that `block` makes of `data`; kinds: s short, b byte, c complex, f float (out)."""
    source, sink = SOURCES[kind_in](as_items(data, kind_in)), SINKS[kind_out]()
    if chunk:
        block.set_max_noutput_items(chunk)
    graph = gr.top_block()
    graph.connect(source, block, sink)
    graph.run()
    return np.array(sink.data(), dtype=TYPES[kind_out])
