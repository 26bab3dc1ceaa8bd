"""Draws what to plug where: the interface's sockets, the cable between them, a pad, a meter, or the amplifier."""

from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainterPath

from wattproof.core.connection import Connection
from wattproof.gui.picture_pen import Pen
from wattproof.procedures.calibrate import METER

_BOX = QRectF(40, 8, 250, 42)  # the interface
_OUT_X, _IN_X, _SOCKET_Y = 96.0, 234.0, 50.0
_OUT, _IN, _PAD, _AMPLIFIER = "out", "in", "pad", "amplifier"


def draw_plugged(pen: Pen, want: str, check: str) -> None:
    """Draw a connection; `check` names outputs and inputs, as "1 > 1, 2 > 2" or "output 1; why"."""
    pen.painter.drawRoundedRect(_BOX, 5, 5)
    if want == METER:
        out, into = check.partition(";")[0].removeprefix("output ").strip(), ""
    else:
        pairs = [pair.split(">") for pair in check.split(",") if ">" in pair]
        out = "/".join(pair[0].strip() for pair in pairs)
        into = "/".join(pair[1].strip() for pair in pairs)
    pen.words(_OUT_X, 34, f"{_OUT} {out}".strip(), bold=True)
    pen.words(_IN_X, 34, f"{_IN} {into}".strip(), bold=True)
    for x in (_OUT_X, _IN_X):
        pen.painter.drawRect(QRectF(x - 8, _SOCKET_Y, 16, 9))
    if want == Connection.AMPLIFIER:
        _amplifier(pen)
        return
    _loop(pen)
    if want == METER:
        _meter(pen)
    elif want == Connection.PAD:
        _pad(pen)


def _loop(pen: Pen) -> None:
    """Draw the cable from the output down and up into the input."""
    pen.ink("blue", 4.0)
    way = QPainterPath(QPointF(_OUT_X, _SOCKET_Y + 9))
    way.cubicTo(_OUT_X, 106, _OUT_X + 26, 100, (_OUT_X + _IN_X) / 2, 100)
    way.cubicTo(_IN_X - 26, 100, _IN_X, 106, _IN_X, _SOCKET_Y + 14)
    pen.painter.drawPath(way)
    pen.arrow(QPointF(_IN_X, _SOCKET_Y + 10), 90)
    pen.ink()


def _pad(pen: Pen) -> None:
    middle = (_OUT_X + _IN_X) / 2
    box = QRectF(middle - 32, 80, 64, 36)
    pen.painter.fillRect(box, pen.colors.color("paper"))
    pen.painter.drawRect(box)
    pen.words(middle, 104, _PAD, bold=True)


def _meter(pen: Pen) -> None:
    """Draw a voltmeter at the output (IEC 60617: a circle with V)."""
    pen.line(_OUT_X, _SOCKET_Y + 20, 44, _SOCKET_Y + 20)
    pen.painter.setBrush(pen.colors.color("paper"))
    pen.painter.drawEllipse(QPointF(28, _SOCKET_Y + 20), 16, 16)
    pen.words(28, _SOCKET_Y + 26, "V", bold=True)
    pen.line(28, _SOCKET_Y + 36, 28, 108)
    for index, half in enumerate((10.0, 6.5, 3.0)):
        pen.line(28 - half, 108 + 4 * index, 28 + half, 108 + 4 * index)


def _amplifier(pen: Pen) -> None:
    """Draw the way back to the table as it was: the output to the amplifier, the attenuator to the input."""
    pen.line(_OUT_X, _SOCKET_Y + 9, _OUT_X, 92)
    pen.line(_OUT_X, 92, 136, 92)
    path = QPainterPath(QPointF(136, 74))
    path.lineTo(136, 110)
    path.lineTo(170, 92)
    path.closeSubpath()
    pen.painter.drawPath(path)
    pen.line(170, 92, 188, 92)
    pen.painter.drawRect(QRectF(188, 84, 30, 16))
    pen.line(218, 92, _IN_X, 92)
    pen.line(_IN_X, 92, _IN_X, _SOCKET_Y + 9)
