# SPDX-License-Identifier: GPL-3.0-or-later
"""
What the panel takes of one core: reports of a 64-point link ten times a second from another thread, as link_panel's handler
gives them, all views in sight, for SECONDS. Processor time of the whole process beside that of a bare event loop.

    QT_QPA_PLATFORM=offscreen PYTHONPATH=build/python python3 tests/speed/panel_speed.py [SECONDS]
"""

import json
import os
import sys
import threading
import time

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import numpy as np
from PyQt5 import QtCore, QtWidgets

from gnuradio import blocks, gr, halfplane
from gnuradio.halfplane.panel.widget import Panel

RATE = 10.0


def report_of_64_points():
    """One report of a noisy link with its settings, as link_watch publishes it, as a PMT."""
    which = halfplane.load_set("qam:64")
    rng = np.random.default_rng(1)
    sent = rng.integers(64, size=200_000)
    spread = np.sqrt(which.es / 10 ** (18 / 10) / 2)
    noise = (rng.normal(size=sent.size) + 1j * rng.normal(size=sent.size)) * spread
    watch = halfplane.link_watch(which, "", 100_000)
    graph = gr.top_block()
    graph.connect(blocks.vector_source_c((np.array(which.points)[sent] + noise).tolist()), (watch, 0))
    graph.connect(blocks.vector_source_s(sent.tolist()), (watch, 1))
    graph.run()
    report = json.loads(watch.report())
    report["settings"] = {"set": which.name, "points": [[p.real, p.imag] for p in which.points], "labels": which.label_strings}
    return halfplane.json_to_pmt(json.dumps(report))


def later(message, number):
    """The report of a message, as if it were the so-manieth."""
    report = json.loads(halfplane.pmt_to_json(message))
    report["sequence"] = number
    report["total"]["in"] += 100_000 * number
    report["total"]["symbol_errors"] += number
    return report


def run(application, seconds, publish=None):
    """Processor time a second of this process while its event loop runs."""
    ended = threading.Event()

    def publisher():
        while not ended.wait(1 / RATE):
            publish()

    thread = threading.Thread(target=publisher)
    if publish:
        thread.start()
    QtCore.QTimer.singleShot(round(1000 * seconds), application.quit)
    began, used = time.monotonic(), time.process_time()
    application.exec_()
    share = (time.process_time() - used) / (time.monotonic() - began)
    ended.set()
    if publish:
        thread.join()
    return share


def main(seconds=30.0):
    application = QtWidgets.QApplication([])
    message = report_of_64_points()
    bare = run(application, min(seconds, 3.0))
    panel = Panel("light")
    panel.resize(1800, 1100)
    panel.show()
    count = [0]

    def publish():
        count[0] += 1
        panel.offer(lambda number=count[0]: later(message, number))

    run(application, 2.0, publish)  # the first pictures
    share = run(application, seconds, publish)
    rows = len(json.loads(halfplane.pmt_to_json(message))["total"]["transitions"])
    print(f"panel, M = 64, {rows} transitions, {RATE:g} reports a second, {seconds:g} s: {100 * share:.2f} % of one core (bare event loop {100 * bare:.2f} %)")


if __name__ == "__main__":
    main(*map(float, sys.argv[1:]))
