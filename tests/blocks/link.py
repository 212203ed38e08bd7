# SPDX-License-Identifier: GPL-3.0-or-later
"""Running links with ideal timing: what is counted lies where the exact rung says, and what is gauged where it was set."""

import hashlib
import json
import signal
import subprocess
import sys
import time

import numpy as np
import pmt
import pytest
from gnuradio import halfplane
from scipy import optimize, stats

from bench import FILL, FIRN, SAMPLES_PER_SYMBOL, assert_account_adds_up, counted, pulse_taps, run_link

# Three sets, each at three Es/N0, about SER 0.1, 0.01 and 0.001.
CASES = [(name, db) for name, levels in {"psk:8": (11.0, 14.5, 16.8), FIRN: (10.0, 14.0, 16.5), "qam:64": (18.5, 22.0, 24.5)}.items()
         for db in levels]


def test_residual_interference_is_below_60_db():
    taps = np.array(pulse_taps())
    both = np.convolve(taps, taps)[len(taps) - 1::SAMPLES_PER_SYMBOL] / np.sum(taps**2)
    interference = 10 * np.log10(2 * np.sum(both[1:] ** 2))
    print(f"residual interference {interference:.1f} dB")
    assert interference < -60


@pytest.mark.parametrize("name, es_n0_db", CASES)
def test_counts_and_gauge(name, es_n0_db):
    which = halfplane.load_set(name)
    symbols = 100000
    report, samples, reference = run_link(which, es_n0_db, symbols, shaped=True, seed=7)
    total = report["total"]
    assert_account_adds_up(report, symbols - FILL)
    assert total["judged"] > 0.9 * symbols and total["slips"] == 0
    assert (total["judged"], total["symbol_errors"], total["bit_errors"]) == counted(which, samples, reference)
    exact = halfplane.predictor(which).ser(es_n0_db)
    low, high = (stats.binom.ppf(q, total["judged"], exact) for q in (0.0005, 0.9995))
    off = (total["es_n0_db"] - es_n0_db) / total["es_n0_db_se"]
    print(f"{which.name} {es_n0_db} dB: {total['symbol_errors']} errors, {low:.0f} … {high:.0f} expected; gauge off by {off:.2f} se")
    assert low <= total["symbol_errors"] <= high
    assert abs(off) < 4
    assert report["input"] == {"es_n0_db": es_n0_db, "es_n0_db_se": 0.0, "source": "declared"}


def test_reported_is_written(tmp_path):
    """Fifty runs: the final report is in the log each time, and every report before it."""
    which = halfplane.load_set("psk:4")
    for run in range(50):
        log = tmp_path / f"{run}.jsonl"
        report, _, _ = run_link(which, 8.0, 9000, window=1000, log=log)
        settings, *lines = [json.loads(line) for line in log.read_text().splitlines()]
        assert settings["schema"] == "halfplane/settings/1"
        assert settings["settings_sha256"] == report["settings_sha256"]
        # The log's time went through PMT and has three decimals.
        last, final = lines[-1], report
        assert last.pop("time")[:19] == final.pop("time")[:19]
        assert last == final, run
        assert final["final"] is True
        assert [line["sequence"] for line in lines] == list(range(lines[0]["sequence"], lines[0]["sequence"] + len(lines)))


def test_settings_travel_with_each_message_and_stand_once_in_the_log(tmp_path):
    """The digest is formed again here, by Python's JSON and SHA-256; the message has what the log has."""
    from gnuradio import blocks, gr

    which = halfplane.load_set(FIRN)
    sent = np.random.default_rng(1).integers(len(which.points), size=20000)
    watch = halfplane.link_watch(which, "draw:1", 100, symbol_rate=9600.0)
    log, ear = halfplane.link_log(str(tmp_path / "log.jsonl")), blocks.message_debug()
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c(np.array(which.points)[sent].tolist()),
                  blocks.throttle(gr.sizeof_gr_complex, 60000), (watch, 0))
    graph.connect(blocks.vector_source_s(sent.tolist()), (watch, 1))
    graph.msg_connect(watch, "report", ear, "store")
    graph.msg_connect(watch, "report", log, "report")
    graph.run()
    first, *reports = [json.loads(line) for line in (tmp_path / "log.jsonl").read_text().splitlines()]
    assert len(reports) == log.written() and len(reports) > 1
    assert all("settings" not in report for report in reports)
    settings = first["settings"]
    assert settings["set"] == which.name and len(settings["points"]) == len(settings["labels"]) == len(which.points)
    assert np.allclose([complex(*point) for point in settings["points"]], which.points, rtol=0, atol=0)
    digest = hashlib.sha256(json.dumps(settings, sort_keys=True, separators=(",", ":")).encode()).hexdigest()
    assert digest == first["settings_sha256"] == reports[0]["settings_sha256"]
    message = json.loads(halfplane.pmt_to_json(ear.get_message(0)))
    assert message.pop("settings") == settings and message == reports[0]


@pytest.mark.parametrize("target, state", [("ser:0.05", "pass"), ("ser:0.002", "fail"), ("ber:0.02", "pass"), ("fer:0.5", "pass")])
def test_verdict_in_the_report(target, state):
    """A link at SER 0.01, looked at from above and below; frames of ten symbols."""
    from gnuradio import blocks, gr

    which = halfplane.load_set(FIRN)
    predictor = halfplane.predictor(which)
    db = optimize.brentq(lambda db: predictor.ser(db) - 0.01, 5, 25)
    graph = gr.top_block()
    watch = halfplane.link_watch(which, "draw:1", 10000, target=target, frame_symbols=10)
    source, noise = halfplane.test_pattern(which, "draw:1"), halfplane.noise_at(which, db, 1.0, 5)
    head = blocks.head(gr.sizeof_short, 200000)
    graph.connect(source, head, halfplane.point_mapper(which), noise, watch)
    graph.connect(head, (watch, 1))
    graph.run()
    report = json.loads(watch.report())
    assert report["verdict"]["state"] == state, report["verdict"]
    total = report["total"]
    assert total["frames"] == 20000 and total["fer_low"] < -np.expm1(10 * np.log1p(-0.01)) < total["fer_high"]


def test_a_second_flowgraph_goes_on_from_the_log(tmp_path):
    """Two flowgraphs, one log: the second's totals are those of both; other settings are refused."""
    from gnuradio import blocks, gr

    which, log = halfplane.load_set("psk:4"), str(tmp_path / "log.jsonl")
    sent = np.random.default_rng(2).integers(4, size=40000)
    decided = np.where(np.arange(40000) % 50 == 0, (sent + 1) % 4, sent)

    def run(part):
        watch = halfplane.link_watch(which, "", 1000, target="ser:0.1", resume=log)
        writer, graph = halfplane.link_log(log), gr.top_block()
        graph.connect(blocks.vector_source_c(np.array(which.points)[decided[part]].tolist()), (watch, 0))
        graph.connect(blocks.vector_source_s(sent[part].tolist()), (watch, 1))
        graph.msg_connect(watch, "report", writer, "report")
        graph.run()
        return json.loads(watch.report())

    first, both = run(slice(0, 20000)), run(slice(20000, 40000))
    assert first["total"]["judged"] == 20000 and both["total"]["judged"] == 40000 and both["total"]["symbol_errors"] == 800
    assert both["window"]["first_symbol"] >= 20000 and both["sequence"] > first["sequence"]
    assert both["verdict"]["log_wealth_pass"] > first["verdict"]["log_wealth_pass"]
    lines = [json.loads(line) for line in open(log)]
    assert [line["sequence"] for line in lines if "sequence" in line] == list(range(both["sequence"] + 1))
    assert all("carry" not in line for line in lines)
    with pytest.raises(ValueError, match='target was "ser:0.1" in the earlier run, is "ser:0.2"'):
        halfplane.link_watch(which, "", 1000, target="ser:0.2", resume=log)


def test_messages_carry_recent_samples_and_the_log_does_not(tmp_path):
    """Each the latest judged ones of its window, where the stream repeats with every window."""
    from gnuradio import blocks, gr

    which, log = halfplane.load_set("psk:4"), str(tmp_path / "log.jsonl")
    sent = np.arange(5000) % 4
    samples = (np.array(which.points)[sent] + 1e-3 * np.arange(5000)).astype(np.complex64)
    reference = np.where(np.arange(5000) < 4900, sent, -3)
    watch, writer, store, graph = halfplane.link_watch(which, "", 5000), halfplane.link_log(log), blocks.message_debug(), gr.top_block()
    graph.connect(blocks.vector_source_c(samples.tolist(), True), blocks.throttle(gr.sizeof_gr_complex, 1e5), (watch, 0))
    graph.connect(blocks.vector_source_s(reference.tolist(), True), (watch, 1))
    graph.msg_connect(watch, "report", writer, "report")
    graph.msg_connect(watch, "report", store, "store")
    graph.start()
    end = time.monotonic() + 20
    while store.num_messages() < 1 and time.monotonic() < end:
        time.sleep(0.02)
    graph.stop()
    graph.wait()
    cloud = pmt.to_python(pmt.dict_ref(store.get_message(0), pmt.intern("cloud"), pmt.PMT_NIL))
    np.testing.assert_array_equal(cloud, samples[4900 - 256 : 4900])
    lines = [json.loads(line) for line in open(log)]
    assert len(lines) >= 2 and all("cloud" not in line for line in lines) and "cloud" not in watch.report()


def test_window_closes_and_the_last_one_is_counted():
    which = halfplane.load_set("psk:4")
    report, _, reference = run_link(which, 20.0, 12345, window=5000)
    assert report["total"]["in"] == 12345
    assert report["total"]["pending"] == 0
    assert len(reference) == 12345


@pytest.mark.parametrize("symbols", [1, 2500, 4096])
def test_a_stream_shorter_than_the_holdback_is_accounted_for(symbols):
    report, _, _ = run_link(halfplane.load_set("psk:4"), 20.0, symbols)
    assert_account_adds_up(report, symbols)
    assert (report["total"]["judged"] > 0) == (symbols > 2200)


def test_the_receivers_own_decisions_are_counted():
    """Decisions from a third port: every tenth wrong on purpose."""
    from gnuradio import blocks, gr

    which = halfplane.load_set("psk:4")
    sent = np.random.default_rng(1).integers(4, size=20000)
    decided = np.where(np.arange(20000) % 10 == 0, (sent + 1) % 4, sent)
    points = np.array(which.points)[sent]
    watch = halfplane.link_watch(which, "", 5000, decisions="receiver")
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c(points.tolist()), (watch, 0))
    graph.connect(blocks.vector_source_s(sent.tolist()), (watch, 1))
    graph.connect(blocks.vector_source_s(decided.tolist()), (watch, 2))
    graph.run()
    report = json.loads(watch.report())
    assert report["decisions"] == "receiver"
    assert report["total"]["symbol_errors"] == 2000 and report["total"]["judged"] == 20000


@pytest.mark.parametrize("make, message", [
    (lambda s: halfplane.link_watch(s, "", 0), "link_watch: window is 0"),
    (lambda s: halfplane.link_watch(s, "", 10, 1.0), "link_watch: confidence is 1"),
    (lambda s: halfplane.link_watch(s, "", 10, float("nan")), "link_watch: confidence is nan"),
    (lambda s: halfplane.link_watch(s, "", 10, 0.9, -1.0), "link_watch: symbol_rate is -1"),
    (lambda s: halfplane.link_watch(s, "", 10, 0.9, 0.0, "mine"), "link_watch: decisions is 'mine'"),
    (lambda s: halfplane.link_watch(s, "", target="fer:0.1"), "target is 'fer:0.1', but frame_symbols is 0"),
    (lambda s: halfplane.link_watch(s, "", target="0.1"), "target is '0.1'; ser:RATE"),
    (lambda s: halfplane.aligner(s, "draw:1", "none"), "aligner: correction is 'none'"),
    (lambda s: halfplane.aligner(s, "draw:1", "running", 15), "aligner: memory is 15"),
    (lambda s: halfplane.aligner(s, "draw:1", "running", 100, float("inf")), "aligner: symbol_rate is inf"),
    (lambda s: halfplane.aligner(s, "o150:10"), "10"),
    (lambda s: halfplane.link_log("/nowhere/at/all.jsonl"), "link_log: path is '/nowhere/at/all.jsonl'"),
])
def test_refused(make, message):
    with pytest.raises(ValueError, match=message):
        make(halfplane.load_set("psk:4"))


def test_losses_and_premises_are_left_out_on_request():
    which = halfplane.load_set("psk:4")
    sent = np.random.default_rng(1).integers(4, size=40000)
    points = np.array(which.points)[sent] + 0.2 * np.random.default_rng(2).normal(size=40000)
    for explain in (True, False):
        from gnuradio import blocks, gr

        watch = halfplane.link_watch(which, "", 5000, explain=explain)
        graph = gr.top_block()
        graph.connect(blocks.vector_source_c(points.tolist()), (watch, 0))
        graph.connect(blocks.vector_source_s(sent.tolist()), (watch, 1))
        graph.run()
        assert ("premises" in json.loads(watch.report())) == explain


ENDLESS = """
import sys
import numpy as np
from gnuradio import blocks, gr, halfplane

which, log = halfplane.load_set("psk:4"), sys.argv[1]
rng = np.random.default_rng(int(sys.argv[2]))
sent = rng.integers(4, size=100000)
decided = np.where(rng.random(100000) < 0.02, (sent + 1) % 4, sent)
watch = halfplane.link_watch(which, "", 1000, target="ser:0.1", resume=log)
writer, graph = halfplane.link_log(log), gr.top_block()
graph.connect(blocks.vector_source_c(np.array(which.points)[decided].tolist(), True), (watch, 0))
graph.connect(blocks.vector_source_s(sent.tolist(), True), (watch, 1))
graph.msg_connect(watch, "report", writer, "report")
graph.run()
"""


def test_killed_while_running_and_gone_on_with(tmp_path):
    """kill -9 of whole flowgraphs, three times: each goes on from what the one before had written, and no line is torn twice."""
    log = tmp_path / "link.jsonl"
    before = None
    for attempt in range(3):
        running = subprocess.Popen([sys.executable, "-c", ENDLESS, str(log), str(attempt)])
        end, first = time.monotonic() + 60, log.read_text().count("\n") if log.exists() else 0
        while not log.exists() or log.read_text().count("\n") < first + 6:
            assert running.poll() is None and time.monotonic() < end
            time.sleep(0.02)
        running.send_signal(signal.SIGKILL)
        running.wait()
        reports = []
        for line in log.read_text().splitlines():
            try:
                reports.append(json.loads(line))
            except ValueError:
                assert "sequence" not in line or not line.endswith("}")  # the one that was being written
        reports = [report for report in reports if "sequence" in report]
        assert [report["sequence"] for report in reports] == sorted({report["sequence"] for report in reports})
        for earlier, later in zip(reports, reports[1:]):
            assert later["total"]["judged"] - earlier["total"]["judged"] == later["window"]["symbols"]
        last = reports[-1]
        assert abs(last["total"]["ser"] - 0.02) < 0.002 and last["total"]["in"] == last["total"]["judged"] + last["total"]["pending"]
        if before is not None:
            assert last["sequence"] > before["sequence"] and last["total"]["judged"] > before["total"]["judged"]
        before = last
