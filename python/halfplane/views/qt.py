# SPDX-License-Identifier: GPL-3.0-or-later
"""A drawing through QPainter: the same primitives and roles as svg.render, for widgets and picture files."""

from __future__ import annotations

import functools

from PyQt5 import QtCore, QtGui

from . import themes
from .drawing import CORNERS, DASHES, STROKES, Arrow, Bar, Cloud, Drawing, Line, Mark, Polygon, Text

_EM = 64  # pixels at which letters are measured and drawn, then scaled: sizes need not be whole
_NO_PEN, _NO_BRUSH = QtGui.QPen(QtCore.Qt.NoPen), QtGui.QBrush(QtCore.Qt.NoBrush)


def paint(painter: QtGui.QPainter, drawing: Drawing, theme: str) -> None:
    """Paints it with its upper left corner at the painter's origin, one unit a logical pixel. The ground is left to the caller."""
    painter.setRenderHints(QtGui.QPainter.Antialiasing | QtGui.QPainter.TextAntialiasing)
    for item in drawing.items:
        _PAINTED[type(item)](painter, item, theme)


def picture(drawing: Drawing, theme: str) -> QtGui.QPicture:
    """The drawing recorded, to be played back as often as a widget is painted."""
    made = QtGui.QPicture()
    painter = QtGui.QPainter(made)
    paint(painter, drawing, theme)
    painter.end()
    return made


def image(drawing: Drawing, theme: str, scale: float = 2.0) -> QtGui.QImage:
    """The drawing on its ground, `scale` pixels a unit."""
    made = QtGui.QImage(max(1, round(drawing.width * scale)), max(1, round(drawing.height * scale)), QtGui.QImage.Format_ARGB32)
    made.fill(colour("ground", theme))
    painter = QtGui.QPainter(made)
    painter.scale(scale, scale)
    paint(painter, drawing, theme)
    painter.end()
    return made


@functools.lru_cache(maxsize=512)
def colour(role: str, theme: str, strength: float = 1.0) -> QtGui.QColor:
    found = QtGui.QColor(themes.THEMES[theme][role])
    found.setAlphaF(strength)
    return found


def note_at(drawing: Drawing, x: float, y: float, near: float = 4.0) -> str:
    """What the topmost primitive there has to say, "" where none has."""
    for item in reversed(drawing.items):
        note = getattr(item, "note", "")
        if note and _bounds(item).adjusted(-near, -near, near, near).contains(x, y):
            return note
    return ""


def _bounds(item) -> QtCore.QRectF:
    if isinstance(item, Bar):
        return QtCore.QRectF(item.x, item.y, item.width, item.height)
    if isinstance(item, Mark):
        return QtCore.QRectF(item.x - item.size / 2, item.y - item.size / 2, item.size, item.size)
    if isinstance(item, Text):
        width = _metrics(item.bold).horizontalAdvance(item.text) * item.size / _EM
        left = item.x - {"start": 0.0, "middle": width / 2, "end": width}[item.anchor]
        return QtCore.QRectF(left, item.y - 0.8 * item.size, width, item.size)
    return _polygon(item.outline() if isinstance(item, Arrow) else item.points).boundingRect()


def _polygon(points) -> QtGui.QPolygonF:
    return QtGui.QPolygonF([QtCore.QPointF(x, y) for x, y in points])


@functools.lru_cache(maxsize=2)
def _font(bold: bool) -> QtGui.QFont:
    found = QtGui.QFont()
    found.setFamilies([name.strip(" '") for name in themes.FONT.split(",") if name.strip(" '") not in ("system-ui", "sans-serif")])
    found.setStyleHint(QtGui.QFont.SansSerif)
    found.setPixelSize(_EM)
    found.setHintingPreference(QtGui.QFont.PreferNoHinting)
    found.setWeight(QtGui.QFont.DemiBold if bold else QtGui.QFont.Normal)
    return found


@functools.lru_cache(maxsize=2)
def _metrics(bold: bool) -> QtGui.QFontMetricsF:
    return QtGui.QFontMetricsF(_font(bold))


def _surface(painter: QtGui.QPainter, item, theme: str) -> None:
    edge = getattr(item, "edge", None)
    pen = QtGui.QPen(colour(edge, theme), item.edge_width) if edge else _NO_PEN
    if edge:
        pen.setJoinStyle(QtCore.Qt.RoundJoin)
    painter.setPen(pen)
    painter.setBrush(colour(item.role, theme, item.strength) if item.role else _NO_BRUSH)


def _hatching(painter: QtGui.QPainter, item, theme: str) -> None:
    painter.setPen(_NO_PEN)
    painter.setBrush(QtGui.QBrush(colour(item.edge or "rest", theme), QtCore.Qt.BDiagPattern))


def _paint_bar(painter, item: Bar, theme: str) -> None:
    box = QtCore.QRectF(item.x, item.y, max(0.0, item.width), max(0.0, item.height))
    _surface(painter, item, theme)
    for _ in range(2 if item.hatch else 1):
        painter.drawRoundedRect(box, item.round, item.round) if item.round else painter.drawRect(box)
        _hatching(painter, item, theme)


def _paint_polygon(painter, item: Polygon | Arrow, theme: str) -> None:
    shape = _polygon(item.outline() if isinstance(item, Arrow) else item.points)
    _surface(painter, item, theme)
    painter.drawPolygon(shape)
    if getattr(item, "hatch", False):
        _hatching(painter, item, theme)
        painter.drawPolygon(shape)


def _paint_line(painter, item: Line, theme: str) -> None:
    dash = DASHES[item.dash]
    pen = QtGui.QPen(colour(item.role, theme), item.width)
    pen.setJoinStyle(QtCore.Qt.RoundJoin)
    pen.setCapStyle(QtCore.Qt.RoundCap if item.width > 1 and not dash else QtCore.Qt.FlatCap)
    if dash:
        pen.setDashPattern([each / item.width for each in dash])  # Qt counts in widths of the pen
    painter.setPen(pen)
    painter.drawPolyline(_polygon(item.points))


def _paint_mark(painter, item: Mark, theme: str) -> None:
    half, at = item.size / 2, QtCore.QPointF(item.x, item.y)
    shown = colour(item.role, theme)
    painter.setPen(_NO_PEN)
    painter.setBrush(shown)
    if item.shape in ("circle", "ring"):
        if item.shape == "ring":
            painter.setPen(QtGui.QPen(shown, 1.6))
            painter.setBrush(colour("ground", theme))
        painter.drawEllipse(at, half, half)
    elif item.shape in STROKES:
        painter.setPen(QtGui.QPen(shown, 1.8, QtCore.Qt.SolidLine, QtCore.Qt.RoundCap))
        for a, b, c, d in STROKES[item.shape]:
            painter.drawLine(at + QtCore.QPointF(a * half, b * half), at + QtCore.QPointF(c * half, d * half))
    else:
        painter.drawPolygon(_polygon((item.x + a * half, item.y + b * half) for a, b in CORNERS[item.shape]))


def _paint_cloud(painter, item: Cloud, theme: str) -> None:
    painter.setPen(QtGui.QPen(colour(item.role, theme, item.strength), item.size, QtCore.Qt.SolidLine, QtCore.Qt.RoundCap))
    painter.drawPoints(_polygon(item.points))


def _paint_text(painter, item: Text, theme: str) -> None:
    scale = item.size / _EM
    share = {"start": 0.0, "middle": 0.5, "end": 1.0}[item.anchor]
    width = _metrics(item.bold).horizontalAdvance(item.text) if share else 0.0
    painter.save()
    painter.translate(item.x, item.y)
    painter.scale(scale, scale)
    at = QtCore.QPointF(-share * width, 0)
    if item.halo:
        path = QtGui.QPainterPath()
        path.addText(at, _font(item.bold), item.text)
        painter.strokePath(path, QtGui.QPen(colour("ground", theme), 3 / scale, QtCore.Qt.SolidLine, QtCore.Qt.RoundCap, QtCore.Qt.RoundJoin))
    painter.setFont(_font(item.bold))
    painter.setPen(colour(item.role, theme))
    painter.drawText(at, item.text)
    painter.restore()


_PAINTED = {
    Bar: _paint_bar, Polygon: _paint_polygon, Arrow: _paint_polygon, Line: _paint_line, Mark: _paint_mark, Cloud: _paint_cloud, Text: _paint_text,
}  # fmt: skip
