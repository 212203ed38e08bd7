# SPDX-License-Identifier: GPL-3.0-or-later
"""One view in a pyqtgraph box: as large as its drawing, to be looked at closer with the mouse or the keyboard."""

from __future__ import annotations

from collections.abc import Callable

from PyQt5 import QtCore, QtGui, QtWidgets  # before pyqtgraph, or it picks another Qt
import pyqtgraph as pg

from ..views import qt
from ..views.drawing import Drawing

FRAME = 1  # around the drawing, in logical pixels
_ZOOM = 1.25  # of one step


class _Picture(pg.GraphicsObject):
    """A recorded drawing."""

    def __init__(self):
        super().__init__()
        self._picture: QtGui.QPicture | None = None
        self._box = QtCore.QRectF()

    def show(self, picture: QtGui.QPicture, width: float, height: float) -> None:
        box = QtCore.QRectF(0, 0, width, height)
        if box != self._box:
            self.prepareGeometryChange()
            self._box = box
        self._picture = picture
        self.update()

    def boundingRect(self) -> QtCore.QRectF:  # noqa: N802 (Qt's name)
        return self._box

    def paint(self, painter, *_) -> None:
        if self._picture is not None:
            self._picture.play(painter)


class Canvas(pg.GraphicsView):
    """
    Shows one view. Ctrl and the wheel, or + and −, zoom; drag or the arrows move; 0 or a double click shows all again.
    Without Ctrl the wheel is left to the page that the canvas stands on. charge: is told the seconds that painting took, by
    clock.
    """

    # Known before the base class is made: it calls resizeEvent.
    drawing: Drawing | None = None
    _whole, _theme = True, ""

    def __init__(self, name: str, charge: Callable[[float], None], clock: Callable[[], float]):
        super().__init__(background=None)
        self.setObjectName(name)
        self._box = pg.ViewBox(lockAspect=True, enableMenu=False, invertY=True, defaultPadding=0.0)
        self._box.disableAutoRange()
        self._item = _Picture()
        self._charge, self._clock = charge, clock
        self._box.addItem(self._item, ignoreBounds=True)
        self.setCentralItem(self._box)
        self.setFocusPolicy(QtCore.Qt.StrongFocus)
        self.setMouseTracking(True)
        self.setHorizontalScrollBarPolicy(QtCore.Qt.ScrollBarAlwaysOff)
        self.setVerticalScrollBarPolicy(QtCore.Qt.ScrollBarAlwaysOff)

    def show_drawing(self, drawing: Drawing, theme: str) -> None:
        """From now on this drawing; the canvas takes its height."""
        before, self.drawing = self.drawing, drawing
        if theme != self._theme:  # an opaque ground: nothing behind it has to be painted again
            self._theme = theme
            self.setBackground(qt.colour("ground", theme))
        self.setAccessibleName(drawing.title)
        self.setAccessibleDescription(drawing.description)
        self._item.show(qt.picture(drawing, theme), drawing.width, drawing.height)
        height = round(drawing.height) + 2 * FRAME
        if self.height() != height:
            self.setFixedHeight(height)
        if self._whole and (before is None or (before.width, before.height) != (drawing.width, drawing.height)):
            self.show_all()

    def show_all(self) -> None:
        self._whole = True
        if self.drawing is not None:
            self._box.setRange(QtCore.QRectF(0, 0, self.drawing.width, self.drawing.height), padding=0, disableAutoRange=True)

    def zoom(self, factor: float, centre: QtCore.QPointF | None = None) -> None:
        """Closer (above 1) or farther, never farther than the whole."""
        shown = self._box.viewRect()
        if self.drawing is None or shown.width() / factor >= self.drawing.width:
            self.show_all()
            return
        self._whole = False
        self._box.scaleBy((1 / factor, 1 / factor), centre)

    def paintEvent(self, event) -> None:  # noqa: N802
        began = self._clock()
        super().paintEvent(event)
        self._charge(self._clock() - began)

    def resizeEvent(self, event) -> None:  # noqa: N802
        super().resizeEvent(event)
        if self._whole:
            self.show_all()

    def wheelEvent(self, event) -> None:  # noqa: N802
        if event.modifiers() & QtCore.Qt.ControlModifier:
            self.zoom(_ZOOM ** (event.angleDelta().y() / 120), self._box.mapSceneToView(self.mapToScene(event.pos())))
            event.accept()
        else:
            event.ignore()

    def mouseDoubleClickEvent(self, event) -> None:  # noqa: N802
        self.show_all()

    def mouseMoveEvent(self, event) -> None:  # noqa: N802
        if event.buttons():
            if not self._whole:
                super().mouseMoveEvent(event)
            return
        at = self._box.mapSceneToView(self.mapToScene(event.pos()))
        note = qt.note_at(self.drawing, at.x(), at.y()) if self.drawing is not None else ""
        QtWidgets.QToolTip.showText(event.globalPos(), note, self)

    def keyPressEvent(self, event) -> None:  # noqa: N802
        moves = {QtCore.Qt.Key_Left: (-1, 0), QtCore.Qt.Key_Right: (1, 0), QtCore.Qt.Key_Up: (0, -1), QtCore.Qt.Key_Down: (0, 1)}
        if event.text() in ("+", "="):
            self.zoom(_ZOOM)
        elif event.text() == "-":
            self.zoom(1 / _ZOOM)
        elif event.text() == "0":
            self.show_all()
        elif event.key() in moves and not self._whole:
            (x, y), shown = moves[event.key()], self._box.viewRect()
            self._box.translateBy(x=0.1 * x * shown.width(), y=0.1 * y * shown.height())
        else:
            event.ignore()
