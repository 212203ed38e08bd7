# SPDX-License-Identifier: GPL-3.0-or-later
"""Flowgraphs that are stopped at any moment, carry two watches, or the smallest and the largest set: no count is lost."""

import json
import time

import numpy as np
import pytest
from gnuradio import blocks, gr, halfplane
from scipy import stats

from bench import FIRN, assert_account_adds_up, counted, run_link

SEED = 3


def link_of(which, es_n0_db, symbols, watch):
    """A bench link into an aligner and a watch."""
    aligner = halfplane.aligner(which, "draw:1")
    graph = gr.top_block()
    graph.connect(halfplane.test_pattern(which, "draw:1"), blocks.head(gr.sizeof_short, symbols),
                  halfplane.point_mapper(which), halfplane.noise_at(which, es_n0_db, 1.0, SEED), aligner, watch)
    graph.connect((aligner, 1), (watch, 1))
    return graph


def test_stopped_at_any_moment_the_totals_are_those_of_an_offline_count():
    which = halfplane.load_set(FIRN)
    # The same stream, run to an end of its own: noise and pattern are functions of the symbol's number.
    symbols = 3_000_000
    _, samples, reference = run_link(which, 12.0, symbols, seed=SEED)
    rng = np.random.default_rng(1)
    for _ in range(12):
        watch = halfplane.link_watch(which, "draw:1", window=5000)
        graph = link_of(which, 12.0, symbols, watch)
        graph.start()
        time.sleep(rng.uniform(0.002, 0.06))
        graph.stop()
        graph.wait()
        total = json.loads(watch.report())["total"]
        handed = total["in"] - total["pending"]
        judged, symbol_errors, bit_errors = counted(which, samples[:handed], reference[:handed])
        assert (total["judged"], total["symbol_errors"], total["bit_errors"]) == (judged, symbol_errors, bit_errors)
        assert total["excluded"]["before_lock"] == np.sum(reference[:handed] == -1)


def test_two_watches_in_one_flowgraph_see_the_same():
    """One judges by nearest point, the other the receiver's decisions: the host's own decoder, on the same samples."""
    which = halfplane.load_set("qam:16")
    reports = []
    for _ in range(2):
        first = halfplane.link_watch(which, "draw:1", window=10000)
        second = halfplane.link_watch(which, "draw:1", window=7777, decisions="receiver")
        aligner = halfplane.aligner(which, "draw:1")
        graph = gr.top_block()
        graph.connect(halfplane.test_pattern(which, "draw:1"), blocks.head(gr.sizeof_short, 100000),
                      halfplane.point_mapper(which), halfplane.noise_at(which, 15.0, 1.0, SEED), aligner)
        detector = halfplane.point_detector(which)
        graph.connect(aligner, detector, (second, 2))
        for watch in (first, second):
            graph.connect(aligner, watch)
            graph.connect((aligner, 1), (watch, 1))
        graph.run()
        reports.append([json.loads(watch.report()) for watch in (first, second)])
    for one, other in reports:
        assert_account_adds_up(one, 100000)
        assert_account_adds_up(other, 100000)
        for name in ("judged", "symbol_errors", "bit_errors", "by_bit", "es_n0_db"):
            assert one["total"][name] == pytest.approx(other["total"][name], rel=1e-12), name
        assert one["settings_sha256"] != other["settings_sha256"]
    # Where windows merged, predictions were summed in another order: counts are the same, they agree to rounding.
    for name in ("in", "judged", "symbol_errors", "bit_errors", "by_bit", "excluded", "nonfinite"):
        assert reports[0][0]["total"][name] == reports[1][0]["total"][name], name


@pytest.mark.parametrize("name, es_n0_db, symbols", [("psk:2", 4.0, 200_000), ("qam:4096", 39.0, 100_000)])
def test_the_smallest_and_the_largest_set(name, es_n0_db, symbols):
    which = halfplane.load_set(name)
    report, samples, reference = run_link(which, es_n0_db, symbols, pattern="draw:1:8192", seed=SEED)
    total = report["total"]
    assert_account_adds_up(report, symbols)
    assert total["judged"] > 0.9 * symbols
    errors = total["symbol_errors"]
    if which.size == 2:
        assert counted(which, samples, reference)[1] == errors
    else:  # the nearest odd integers: a square grid needs no search
        judged = reference >= 0
        side = 64
        levels = np.clip(np.round((np.stack([samples.real, samples.imag])[:, judged] + side - 1) / 2), 0, side - 1)
        assert errors == np.sum(levels[1] * side + levels[0] != reference[judged])
    # A correction over 2,000 symbols costs about 2/1,000 of Es/N0 and, in sets as large as this, some more while it
    # settles: a hundredth of a dB either way.
    predict = halfplane.predictor(which).ser
    low, high = (stats.binom.ppf(q, total["judged"], predict(es_n0_db + off)) for q, off in ((1e-4, 0.01), (1 - 1e-4, -0.03)))
    assert low <= errors <= high
