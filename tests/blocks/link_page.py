# SPDX-License-Identifier: GPL-3.0-or-later
"""link_page in running flowgraphs: shows what the watch reports, survives what is no report, gives its port back."""

import json
import socket
import subprocess
import sys
import threading
import time
import urllib.request

import numpy as np
import pmt
import pytest
from gnuradio import blocks, gr, halfplane

PATIENCE = 20.0


def free_port():
    with socket.socket() as found:
        found.bind(("127.0.0.1", 0))
        return found.getsockname()[1]


def fetch(block, path):
    with urllib.request.urlopen(block.url() + path, timeout=PATIENCE) as answer:
        return answer.read()


def endless_link(page, window=5000):
    """A noisy four-point link that runs until it is stopped."""
    which = halfplane.load_set("psk:4")
    rng = np.random.default_rng(3)
    sent = rng.integers(4, size=40_000)
    noise = (rng.normal(size=40_000) + 1j * rng.normal(size=40_000)) * 0.28
    watch = halfplane.link_watch(which, "", window)
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c((np.array(which.points)[sent] + noise).tolist(), True), blocks.throttle(gr.sizeof_gr_complex, 2e5), (watch, 0))
    graph.connect(blocks.vector_source_s(sent.tolist(), True), (watch, 1))
    graph.msg_connect(watch, "report", page, "report")
    return graph, watch


def wait_for(condition):
    end = time.monotonic() + PATIENCE
    while not condition():
        assert time.monotonic() < end
        time.sleep(0.05)


def shows_something(page):
    try:
        fetch(page, "report")
        return True
    except urllib.error.HTTPError as error:
        assert error.code == 404
        return False


def test_the_page_shows_what_the_watch_reports():
    page = halfplane.link_page(free_port())
    graph, watch = endless_link(page)
    for _ in range(2):  # started again, it serves again
        graph.start()
        try:
            wait_for(lambda: shows_something(page))
            shown = json.loads(fetch(page, "report"))
            assert shown["schema"] == "halfplane/report/1" and shown["total"]["symbol_errors"] > 0
            assert shown["settings"]["set"] == "psk:4" and len(shown["settings"]["points"]) == 4
            later = json.loads(watch.report())
            assert shown["sequence"] <= later["sequence"]
            assert b"halfplane_symbols_judged_total" in fetch(page, "metrics")
        finally:
            graph.stop()
            graph.wait()
        assert not [thread for thread in threading.enumerate() if thread.name == "halfplane page"]
        with pytest.raises(OSError):
            fetch(page, "report")


def test_messages_that_are_no_report_leave_the_block_alive():
    page = halfplane.link_page(free_port())
    graph, _ = endless_link(page)
    port = pmt.intern("report")
    graph.start()
    try:
        for wrong in (pmt.PMT_NIL, pmt.intern("text"), pmt.from_complex(1j), pmt.cons(pmt.PMT_T, pmt.PMT_T), pmt.from_long(-3)):
            page.to_basic_block()._post(port, wrong)
        wait_for(lambda: shows_something(page))
        before = json.loads(fetch(page, "report"))["sequence"]
        wait_for(lambda: json.loads(fetch(page, "report"))["sequence"] > before)
    finally:
        graph.stop()
        graph.wait()


def test_a_port_in_use_is_said_when_the_block_is_made():
    with socket.socket() as other:
        other.bind(("127.0.0.1", 0))
        other.listen()
        port = other.getsockname()[1]
        with pytest.raises(RuntimeError, match=f"link_page: port {port} on 127.0.0.1 cannot be had: Address already in use"):
            halfplane.link_page(port)
    with pytest.raises(ValueError, match="link_page: address is '0.0.0.0': others can reach it, so a token is demanded"):
        halfplane.link_page(free_port(), "0.0.0.0")


def test_without_its_packages_the_rest_works_and_the_error_names_them():
    code = """
import sys
sys.modules["aiohttp"] = None
from gnuradio import halfplane
assert halfplane.link_log and "link_page" in dir(halfplane)
try:
    halfplane.link_page
except ImportError as error:
    assert "apt install" in str(error) and "python3-aiohttp" in str(error), error
    sys.exit(7)
"""
    assert subprocess.run([sys.executable, "-c", code], timeout=60).returncode == 7
