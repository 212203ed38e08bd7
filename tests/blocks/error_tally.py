# SPDX-License-Identifier: GPL-3.0-or-later
"""error_tally in flowgraphs: packed and unpacked, a delay, streams of unequal length, its reports in the log."""

import json

import numpy as np
import pytest
from gnuradio import blocks, gr, halfplane


def run(sent, received, log=None, **how):
    tally = halfplane.error_tally(**how)
    graph = gr.top_block()
    graph.connect(blocks.vector_source_b(sent.tolist()), (tally, 0))
    graph.connect(blocks.vector_source_b(received.tolist()), (tally, 1))
    if log:
        log = halfplane.link_log(str(log))
        graph.msg_connect(tally, "report", log, "report")
    graph.run()
    return json.loads(tally.report())


def bits_with_errors(count, rate, seed=1):
    rng = np.random.default_rng(seed)
    sent = rng.integers(2, size=count, dtype=np.uint8)
    wrong = (rng.random(count) < rate).astype(np.uint8)
    return sent, sent ^ wrong, wrong


@pytest.mark.parametrize("packed", [False, True])
def test_counts_and_frames_against_numpy(packed, tmp_path):
    sent, received, wrong = bits_with_errors(200000, 0.003)
    streams = [np.packbits(sent), np.packbits(received)] if packed else [sent, received]
    report = run(*streams, log=tmp_path / "log.jsonl", packed=packed, frame_bits=100, target="ber:1e-2", window=10000)
    total = report["total"]
    assert total["bits"] == total["in"] == 200000 and total["bit_errors"] == wrong.sum()
    assert total["frames"] == 2000 and total["frame_errors"] == wrong.reshape(-1, 100).any(axis=1).sum()
    assert report["verdict"]["state"] == "pass" and report["final"]
    settings, *lines = [json.loads(line) for line in (tmp_path / "log.jsonl").read_text().splitlines()]
    assert settings["settings"]["packed"] is packed and lines[-1]["total"] == total


def test_delay_is_dropped_and_accounted_for():
    sent, received, wrong = bits_with_errors(50000, 0.01)
    late = np.concatenate([np.ones(1234, np.uint8), received])
    total = run(sent, late, delay=1234)["total"]
    assert total["bit_errors"] == wrong.sum() and total["judged"] == 50000
    assert total["excluded"] == {"delay": 1234, "no_bit": 0} and total["in"] == 51234


@pytest.mark.parametrize("shorter", [0, 1])
def test_streams_of_unequal_length(shorter):
    streams = list(bits_with_errors(30000, 0.01)[:2])
    streams[shorter] = streams[shorter][:20001]
    total = run(*streams)["total"]
    assert total["judged"] == 20001 and total["bit_errors"] == np.sum(streams[0][:20001] != streams[1][:20001])


def test_nothing_came():
    total = run(np.array([], np.uint8), np.array([], np.uint8))["total"]
    assert total["bits"] == 0 and "ber" not in total


@pytest.mark.parametrize("how, message", [
    (dict(window=0), "error_tally: window is 0"),
    (dict(target="ser:0.1"), "there are bits and frames here, no symbols"),
    (dict(target="fer:0.1"), "frame_bits is 0"),
    (dict(confidence=0.0), "confidence must lie between 0 and 1, got 0"),
])
def test_refused(how, message):
    with pytest.raises(ValueError, match=message):
        halfplane.error_tally(**how)
