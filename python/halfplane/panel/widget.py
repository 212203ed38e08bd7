# SPDX-License-Identifier: GPL-3.0-or-later
"""The panel: three answers above six views, in one to three columns, light or dark. Takes reports; knows nothing of GNU Radio."""

from __future__ import annotations

import collections
import logging
import math
import time
from collections.abc import Callable

from PyQt5 import QtCore, QtGui, QtWidgets  # before pyqtgraph, or it picks another Qt

from ..views import themes
from ..views.board import Board
from ..views.pace import Pace
from . import saving
from .canvas import FRAME, Canvas

# By view: the height to ask for and, by number of columns, the column it stands in.
_HEIGHTS = {"ladder": 290, "losses": 240, "history": 270, "decision_map": 460, "curve": 350, "account": 300}
_COLUMNS = {
    1: (("ladder", "losses", "history", "decision_map", "curve", "account"),),
    2: (("ladder", "losses", "history", "curve"), ("decision_map", "account")),
    3: (("ladder", "losses", "history"), ("decision_map", "curve"), ("account",)),
}
_TWO, _THREE = 800, 1300  # widths in logical pixels from which there are so many columns
_GAP, _LEAST = 12, 320
READING = 0.25  # seconds between two reports that are read
_LOG = logging.getLogger("halfplane.panel")
THEMES = ("system", "light", "dark")


class Panel(QtWidgets.QWidget):
    """
    publish() and offer() may be called from any thread and draw nothing. Drawing happens in the GUI's thread, of the newest
    report alone and of what is to be seen alone; with the reading of what was offered it takes at most `share` of one core.

    theme: "system" (as light or dark as the application's palette), "light" or "dark". log: path of the file of link_log that a
    saved report is made from; "": from the latest report.
    """

    _came = QtCore.pyqtSignal()

    def __init__(self, theme: str = "system", log: str = "", share: float = 0.03, parent: QtWidgets.QWidget | None = None):
        if theme not in THEMES:
            raise ValueError(f"theme is {theme!r}: one of {', '.join(THEMES)} is wanted")
        super().__init__(parent)
        self.board = Board()
        self._theme, self._log = theme, log
        self._pace = Pace(("heading", *_HEIGHTS), share)
        self._offered: collections.deque[Callable[[], dict]] = collections.deque(maxlen=1)
        self._read_at = float("-inf")
        self._told = False  # a signal is under way
        self._unseen: set[str] = set()  # what was not drawn because nobody could see it
        self._columns = 0
        self._layers: dict[str, QtWidgets.QPushButton] = {}  # of the decision map
        self._canvases = {name: Canvas(name, self._pace.charge, time.thread_time) for name in ("heading", *_HEIGHTS)}
        self._build()
        self._came.connect(self._note_news, QtCore.Qt.QueuedConnection)
        self._timer = QtCore.QTimer(self)
        self._timer.setSingleShot(True)
        self._timer.timeout.connect(self._draw_due)
        self._dress()
        self._pace.renew()
        self._timer.start(0)

    def publish(self, report: dict) -> None:
        """Shows this report from now on. ValueError where it is none."""
        self._offered.clear()
        self.board.put(report)
        self._tell()

    def offer(self, make: Callable[[], dict]) -> None:
        """Like publish(make()), but make() is called in the GUI's thread, if at all: of several offers the newest counts."""
        self._offered.append(make)
        self._tell()

    @property
    def theme(self) -> str:
        """The one that is shown: light or dark."""
        if self._theme != "system":
            return self._theme
        return "dark" if QtWidgets.QApplication.palette().color(QtGui.QPalette.Window).lightnessF() < 0.5 else "light"

    def set_theme(self, theme: str) -> None:
        if theme not in THEMES:
            raise ValueError(f"theme is {theme!r}: one of {', '.join(THEMES)} is wanted")
        self._theme = theme
        self._dress()
        self.draw_all()

    def canvas(self, name: str) -> Canvas:
        """The canvas of a view, or of the heading."""
        return self._canvases[name]

    def draw_all(self) -> None:
        """Draws everything now, whatever was drawn lately."""
        for name in self._canvases:
            self._draw(name)

    def save_picture(self, path: str) -> None:
        """All views as they would be drawn now, as PNG or SVG. ValueError or OSError say what is wrong."""
        saving.picture(self.board, path, self.theme)

    def save_report(self, path: str) -> None:
        """An acceptance report (.html), or the latest report with its settings (.json). ValueError or OSError say what is wrong."""
        saving.report(self.board, path, self._log)

    def sizeHint(self) -> QtCore.QSize:  # noqa: N802 (Qt's name)
        return QtCore.QSize(1360, 900)

    def resizeEvent(self, event) -> None:  # noqa: N802
        super().resizeEvent(event)
        self._arrange()

    def _build(self) -> None:
        self._bar = QtWidgets.QHBoxLayout()
        self._title = QtWidgets.QLabel("Link")
        self._title.setObjectName("title")
        self._title.setSizePolicy(QtWidgets.QSizePolicy.Ignored, QtWidgets.QSizePolicy.Preferred)  # a long name gives way to the buttons
        self._bar.addWidget(self._title, 1)
        for text, key, action in (
            ("&Colours", "Ctrl+T", self._next_theme), ("&Picture", "Ctrl+P", self._ask_picture), ("&Report", "Ctrl+S", self._ask_report),
        ):  # fmt: skip
            button = QtWidgets.QPushButton(text)
            button.setShortcut(key)
            button.setToolTip({"&Colours": "Light or dark"}.get(text, f"Save a {text[1:].lower()}") + f" ({key})")
            button.clicked.connect(action)
            self._bar.addWidget(button)
        self._map_bar = QtWidgets.QWidget()
        row = QtWidgets.QHBoxLayout(self._map_bar)
        row.setContentsMargins(0, 0, 0, 0)
        row.addStretch(1)
        for name, text, key, shown in (("labels", "&Labels", "Ctrl+L", False), ("samples", "Sa&mples", "Ctrl+M", True)):
            button = self._layers[name] = QtWidgets.QPushButton(text)
            button.setCheckable(True)
            button.setChecked(shown)
            button.setShortcut(key)
            button.setToolTip(f"Decision map: {name} on or off ({key})")
            button.toggled.connect(lambda *_: self._draw("decision_map"))
            row.addWidget(button)
        self._grid = QtWidgets.QHBoxLayout()
        self._grid.setSpacing(_GAP)
        inside = QtWidgets.QWidget()
        inside.setObjectName("inside")
        body = QtWidgets.QVBoxLayout(inside)
        body.setContentsMargins(_GAP, _GAP, _GAP, _GAP)
        body.setSpacing(_GAP)
        body.addLayout(self._bar)
        body.addWidget(self._canvases["heading"])
        body.addLayout(self._grid)
        body.addStretch(1)
        self._scroll = QtWidgets.QScrollArea()
        self._scroll.setWidgetResizable(True)
        self._scroll.setHorizontalScrollBarPolicy(QtCore.Qt.ScrollBarAlwaysOff)
        self._scroll.setVerticalScrollBarPolicy(QtCore.Qt.ScrollBarAlwaysOn)  # or widths would change as drawings grow
        self._scroll.setFrameShape(QtWidgets.QFrame.NoFrame)
        self._scroll.setFocusPolicy(QtCore.Qt.NoFocus)
        self._scroll.setWidget(inside)
        self._scroll.verticalScrollBar().valueChanged.connect(self._scrolled)
        outer = QtWidgets.QVBoxLayout(self)
        outer.setContentsMargins(0, 0, 0, 0)
        outer.addWidget(self._scroll)
        self.setMinimumWidth(_LEAST)

    def _arrange(self) -> None:
        """Into as many columns as there is room for; then all views are drawn to their new width."""
        columns = 3 if self.width() >= _THREE else 2 if self.width() >= _TWO else 1
        if columns != self._columns:
            self._columns = columns
            while self._grid.count():
                old = self._grid.takeAt(0).layout()
                while old.count():
                    old.takeAt(0)
                old.deleteLater()
            before = self._canvases["heading"]
            for names in _COLUMNS[columns]:
                column = QtWidgets.QVBoxLayout()
                column.setSpacing(_GAP)
                self._grid.addLayout(column, 1)
                for name in names:
                    if name == "decision_map":
                        column.addWidget(self._map_bar)
                        for button in self._layers.values():
                            QtWidgets.QWidget.setTabOrder(before, button)
                            before = button
                    column.addWidget(self._canvases[name])
                    QtWidgets.QWidget.setTabOrder(before, self._canvases[name])
                    before = self._canvases[name]
                column.addStretch(1)
        self._pace.renew()
        self._timer.start(0)

    def _width_of(self, name: str) -> float:
        room = self._scroll.viewport().width() - 2 * _GAP
        if name != "heading":
            room = (room - (self._columns - 1) * _GAP) / max(1, self._columns)
        return max(float(_LEAST - 2 * _GAP), float(int(room))) - 2 * FRAME

    def _scrolled(self) -> None:
        if self._unseen:
            self._pace.renew(*self._unseen)
            self._unseen.clear()
            self._timer.start(0)

    def _tell(self) -> None:
        if not self._told:
            self._told = True
            self._came.emit()

    def _note_news(self) -> None:
        self._told = False
        if not self._offered:
            self._pace.renew()
        # One that waits already comes soon enough: the pace has its reasons.
        if not self._timer.isActive():
            self._timer.start(0)

    def _read_offer(self, now: float) -> float | None:
        """Reads what was offered, if it is time → seconds until it is; None where nothing is left."""
        if self._offered and now >= self._read_at + READING:
            self._read_at = now
            began = time.thread_time()
            try:
                self.board.put(self._offered.pop()())
                self._pace.renew()
            except IndexError:
                pass  # a published one came first
            except ValueError as error:
                _LOG.error("what was offered is no report: %s", error)
            self._pace.charge(time.thread_time() - began)
        return self._read_at + READING - now if self._offered else None

    def _draw_due(self) -> None:
        now = time.monotonic()
        reading = self._read_offer(now)
        name = self._pace.due(now)
        if name is not None:
            if self._canvases[name].visibleRegion().isEmpty() and self._canvases[name].drawing is not None:
                self._pace.spent(name, 0.0, now)  # out of sight: drawn once it is scrolled to
                self._unseen.add(name)
            else:
                began = time.thread_time()
                self._draw(name)
                self._pace.spent(name, time.thread_time() - began, now)
        waits = [wait for wait in (reading, self._pace.wait(time.monotonic())) if wait is not None]
        if waits:
            self._timer.start(max(1, math.ceil(1000 * min(waits))))

    def _draw(self, name: str) -> None:
        width, height = self._width_of(name), float(_HEIGHTS.get(name, 92))
        if name == "decision_map":  # a plane: no higher than it is wide
            height = min(height, width + 60)
        shown = {layer: button.isChecked() for layer, button in self._layers.items()}
        self._canvases[name].show_drawing(self.board.draw(name, (width, height), **shown), self.theme)
        if name == "heading":
            report = self.board.latest()[0]
            title = "  ".join(filter(None, (report.get("set", "Link"), report.get("pattern", ""))))
            if self._title.text() != title:
                self._title.setText(title)

    def _dress(self) -> None:
        shown = themes.THEMES[self.theme]
        self._scroll.setStyleSheet(
            f"QWidget#inside, QScrollArea {{ background: {shown['ground']}; }}"
            f"QLabel#title {{ color: {shown['ink']}; font-weight: 600; font-size: 16px; }}"
            f"QPushButton {{ font-size: 12px; color: {shown['ink']}; background: {shown['raised']}; border: 1px solid {shown['rule']}; border-radius: 4px; padding: 4px 11px; }}"
            f"QPushButton:checked {{ color: {shown['ground']}; background: {shown['exact']}; }}"
            f"QPushButton:hover {{ border-color: {shown['quiet']}; }}"
            f"QPushButton:focus {{ border: 2px solid {shown['exact']}; padding: 3px 10px; }}"
            f"QGraphicsView {{ border: 1px solid {shown['rule']}; background: {shown['ground']}; }}"
            f"QGraphicsView#heading {{ border-color: {shown['ground']}; }}"
            f"QScrollBar {{ background: {shown['ground']}; width: 12px; }} QScrollBar::handle {{ background: {shown['rule']}; border-radius: 4px; min-height: 30px; }}"
            f"QScrollBar::add-line, QScrollBar::sub-line {{ height: 0; }}"
            f"QGraphicsView:focus {{ border: 2px solid {shown['exact']}; }}"
        )

    def _next_theme(self) -> None:
        self.set_theme("light" if self.theme == "dark" else "dark")

    def _ask_picture(self) -> None:
        self._ask("Save picture", "link.png", "Picture (*.png *.svg)", self.save_picture)

    def _ask_report(self) -> None:
        self._ask("Save report", "link.html", "Acceptance report (*.html);;Report as it is (*.json)", self.save_report)

    def _ask(self, title: str, name: str, kinds: str, save) -> None:
        path, _ = QtWidgets.QFileDialog.getSaveFileName(self, title, name, kinds)
        if not path:
            return
        try:
            save(path)
        except (OSError, ValueError) as error:
            QtWidgets.QMessageBox.warning(self, title, str(error))
