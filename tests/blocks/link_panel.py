# SPDX-License-Identifier: GPL-3.0-or-later
"""link_panel in a running flowgraph, offscreen; and a module that is whole without Qt."""

import json
import os
import subprocess
import sys
import time

os.environ["QT_QPA_PLATFORM"] = "offscreen"

import pmt
import pytest
from gnuradio import gr, halfplane
from link_page import endless_link
from PyQt5 import QtWidgets


@pytest.fixture(scope="module")
def application():
    return QtWidgets.QApplication.instance() or QtWidgets.QApplication([])


def test_it_shows_what_the_watch_reports(application):
    panel = halfplane.link_panel("dark")
    assert isinstance(panel, QtWidgets.QWidget)
    panel.resize(1000, 700)
    panel.show()
    graph, watch = endless_link(panel)
    port = pmt.intern("report")
    graph.start()
    try:
        for wrong in (pmt.PMT_NIL, pmt.intern("text"), pmt.from_complex(1j), pmt.dict_add(pmt.make_dict(), pmt.intern("total"), pmt.from_long(3))):
            panel.to_basic_block()._post(port, wrong)
        end = time.monotonic() + 20
        while panel.panel.board.taken < 4:
            assert time.monotonic() < end
            application.processEvents()
            time.sleep(0.01)
    finally:
        graph.stop()
        graph.wait()
    panel.panel.draw_all()
    report, settings = panel.panel.board.latest()
    assert report["schema"] == "halfplane/report/1" and settings["set"] == "psk:4"
    assert report["sequence"] <= json.loads(watch.report())["sequence"]
    assert panel.panel.canvas("decision_map").drawing.description != "The set is not known yet."
    panel.close()


def test_parameters_that_are_not_fit(application):
    with pytest.raises(ValueError, match="link_panel: theme is 'blue'"):
        halfplane.link_panel("blue")


@pytest.mark.parametrize("missing", ["PyQt5", "pyqtgraph"])
def test_without_qt_the_rest_works_and_the_error_names_the_packages(missing):
    code = f"""
import sys
sys.modules[{missing!r}] = None
from gnuradio import halfplane
assert halfplane.link_log and halfplane.link_page and "link_panel" in dir(halfplane)
try:
    halfplane.link_panel
except ImportError as error:
    assert "apt install python3-pyqt5 python3-pyqtgraph" in str(error) and {missing!r} in str(error), error
    sys.exit(7)
"""
    assert subprocess.run([sys.executable, "-c", code], timeout=60).returncode == 7
