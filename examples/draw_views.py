# SPDX-License-Identifier: GPL-3.0-or-later
"""
Draws the views of a log into one picture, as the panel saves them: the picture at the head of the README.

    python3 examples/draw_views.py LOG PICTURE.png [paper|night]

Needs Debian's python3-pyqt5 and python3-pyqtgraph, no display, and the module where Python finds it.
"""

import json
import os
import sys

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

from PyQt5 import QtWidgets  # noqa: E402, I001 (ahead of pyqtgraph, which takes the Qt it finds)
from gnuradio.halfplane.panel import saving  # noqa: E402
from gnuradio.halfplane.views.board import Board  # noqa: E402


def draw(log, picture, theme):
    application = QtWidgets.QApplication.instance() or QtWidgets.QApplication([])
    board, settings = Board(), None
    with open(log, encoding="utf-8") as lines:
        for line in map(json.loads, lines):
            settings = line.get("settings", settings)
            if "total" in line:
                board.put({**line, "settings": settings})
    saving.picture(board, picture, theme)
    return application


if __name__ == "__main__":
    draw(sys.argv[1], sys.argv[2], sys.argv[3] if len(sys.argv) > 3 else "light")
