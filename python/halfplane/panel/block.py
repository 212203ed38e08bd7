# SPDX-License-Identifier: GPL-3.0-or-later
"""link_panel: the link on the screen, as a widget block of a Qt flowgraph."""

from __future__ import annotations

import json

from PyQt5 import QtWidgets  # before pyqtgraph, or it picks another Qt
from gnuradio import gr
import pmt

from .. import blocks_python
from ..views.cloud import with_cloud
from .widget import Panel


class link_panel(gr.basic_block, QtWidgets.QWidget):  # noqa: N801 (blocks are named as the host names them)
    """
    Message port `report` (in): the reports of link_watch. Shows whether the link is locked, whether it is as good as it can
    be, and how sure that is; below, six views of the report.

    theme: "system", "light" or "dark". log: path of link_log's file, which `Save report` makes an acceptance report of; "": of
    the latest report. Raises ValueError where theme is none of these.
    """

    def __init__(self, theme: str = "system", log: str = "", parent: QtWidgets.QWidget | None = None):
        gr.basic_block.__init__(self, name="link_panel", in_sig=None, out_sig=None)
        QtWidgets.QWidget.__init__(self, parent)
        try:
            self.panel = Panel(theme, log, parent=self)
        except ValueError as error:
            raise ValueError(f"link_panel: {error}") from None
        layout = QtWidgets.QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self.panel)
        port = pmt.intern("report")
        self._lock_state = None
        self.message_port_register_in(port)
        self.set_msg_handler(port, self._take)

    def _take(self, message) -> None:
        """
        In the block's own thread: hands the message to the GUI's, which reads only those that it has time for. One in which the
        lock changed is always read, so that the history knows of it. An exception here would end this thread.
        """
        try:
            state = _lock_state(message)
            if state != self._lock_state:
                self._lock_state = state
                self.panel.publish(_as_report(message))
            else:
                self.panel.offer(lambda: _as_report(message))
        except Exception as error:
            self.logger.error(f"a message on `report` is no report: {error}")


def _as_report(message) -> dict:
    return with_cloud(json.loads(blocks_python.pmt_to_json(message)), message)


def _lock_state(message) -> str:
    if not pmt.is_dict(message):
        raise ValueError("a dict is wanted")
    lock = pmt.dict_ref(message, pmt.intern("lock"), pmt.PMT_NIL)
    state = pmt.dict_ref(lock, pmt.intern("state"), pmt.PMT_NIL) if pmt.is_dict(lock) else pmt.PMT_NIL
    return pmt.symbol_to_string(state) if pmt.is_symbol(state) else ""
