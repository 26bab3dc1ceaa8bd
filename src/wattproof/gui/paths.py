"""Turns arrays into what Qt paints quickly: polylines of bounded length, hatching, pens."""

from typing import Any

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QPainter, QPen, QPolygonF
from shiboken6 import VoidPtr

Pixels = NDArray[np.float64]
_THIN = 0.2
_POINT_BYTES = 16  # QPointF: two doubles
_buffer: Any = VoidPtr  # its stub knows plain addresses only


def polyline(x: Pixels, y: Pixels) -> QPolygonF:
    """Return a polyline from two arrays of equal length, in pixels, without a Python object per point."""
    line = QPolygonF()
    line.resize(len(x))
    if len(x):
        buffer = _buffer(line.data(), len(x) * _POINT_BYTES, True)
        memory = np.frombuffer(buffer, dtype=np.float64).reshape(-1, 2)
        memory[:, 0] = x
        memory[:, 1] = y
    return line


def thinned(x: Pixels, y: Pixels, columns: int) -> tuple[Pixels, Pixels]:
    """Return the lowest and highest point per pixel column where there are more than two points a column."""
    if len(x) <= 2 * columns or columns < 1:
        return x, y
    size = -(-len(x) // columns)
    whole = len(x) // size * size
    blocks = y[:whole].reshape(-1, size)
    first = blocks.argmin(axis=1)
    second = blocks.argmax(axis=1)
    starts = np.arange(0, whole, size)
    picked = np.sort(np.column_stack((first, second)), axis=1) + starts[:, None]
    index = np.append(picked.ravel(), np.arange(whole, len(x)))
    return x[index], y[index]


def draw_bold(painter: QPainter, line: QPolygonF, color: QColor, width: float) -> None:
    """Draw a polyline about `width` pixels thick as shifted lines of one pixel: five times cheaper than a wide pen."""
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, on=True)
    painter.setPen(hair(color))
    reach = (width - 1) / 2
    shifts = ((-reach, 0.0), (0.0, -reach), (reach, 0.0), (0.0, reach)) if reach > _THIN else ((0.0, 0.0),)
    for x, y in shifts:
        painter.translate(x, y)
        painter.drawPolyline(line)
        painter.translate(-x, -y)


def hair(color: QColor) -> QPen:
    """Return a pen one pixel wide at any scale."""
    pen = QPen(color, 1.0)
    pen.setCosmetic(True)
    return pen


def solid(color: QColor, width: float, *, round_ends: bool = False) -> QPen:
    """Return a pen of a width in pixels."""
    pen = QPen(color, width)
    pen.setCapStyle(Qt.PenCapStyle.RoundCap if round_ends else Qt.PenCapStyle.FlatCap)
    pen.setJoinStyle(Qt.PenJoinStyle.RoundJoin if round_ends else Qt.PenJoinStyle.MiterJoin)
    return pen


def hatch(painter: QPainter, area: QRectF, color: QColor, step: float) -> None:
    """Fill an area with slanted lines: the mark of an overloaded capture, and of nothing else."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, on=True)
    painter.setClipRect(area)
    painter.setPen(QPen(color, max(1.5, step / 6)))
    offset = -area.height()
    while offset < area.width():
        start = QPointF(area.left() + offset, area.bottom())
        painter.drawLine(QLineF(start, QPointF(start.x() + area.height(), area.top())))
        offset += step
    painter.restore()
    painter.setPen(QPen(color, max(1.5, step / 8)))
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.drawRect(area)
