"""Draws the five stations in the open circuit symbols of the trade (IEC 60617), in units of the drawing."""

import math
from collections.abc import Callable

import attrs
from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPainterPath, QPolygonF

from wattproof.gui.paths import hatch, solid
from wattproof.gui.stations import Place, Station
from wattproof.gui.theme import Palette

WIRE_Y = 62.0  # where the signal's wire runs through every station
RETURN_Y = 142.0  # where it returns: ground, or the second terminal of a bridge-tied output
SHUNT_X = 58.0
SYMBOL_RIGHT = 96.0
_WIDTH = 2.2


@attrs.frozen
class Sketch:
    """What a symbol needs to draw itself: the painter in drawing units, colours, the station, its width."""

    painter: QPainter
    colors: Palette
    station: Station
    width: float
    bridge_tied: bool

    def line(self, x1: float, y1: float, x2: float, y2: float) -> None:
        """Draw one wire."""
        self.painter.drawLine(QLineF(x1, y1, x2, y2))

    def node(self, x: float, y: float) -> None:
        """Draw a joint of wires."""
        self.painter.setBrush(self.colors.color("ink"))
        self.painter.drawEllipse(QPointF(x, y), 4.0, 4.0)
        self.painter.setBrush(self.colors.color("paper"))

    def box(self, area: QRectF) -> None:
        """Draw a resistor's or converter's body."""
        self.painter.drawRect(area)

    def ground(self, x: float, y: float) -> None:
        """Draw earth: three bars of falling length (IEC 60617-S00200)."""
        for index, half in enumerate((13.0, 8.5, 4.0)):
            self.line(x - half, y + 5 * index, x + half, y + 5 * index)


def draw_symbol(place: Place, sketch: Sketch) -> None:
    """Draw a station's symbol with the wires that run through it."""
    painter = sketch.painter
    painter.setPen(solid(sketch.colors.color("ink"), _WIDTH))
    painter.setBrush(sketch.colors.color("paper"))
    _DRAWN[place](sketch)


def _tone(sketch: Sketch) -> None:
    sketch.line(SHUNT_X, WIRE_Y, sketch.width, WIRE_Y)
    sketch.line(SHUNT_X, WIRE_Y, SHUNT_X, RETURN_Y - 10)
    sketch.ground(SHUNT_X, RETURN_Y - 10)
    sketch.painter.drawEllipse(QPointF(SHUNT_X, WIRE_Y), 30.0, 30.0)
    wave = QPainterPath(QPointF(SHUNT_X - 17, WIRE_Y))
    for step in range(1, 35):
        height = 11.0 * math.sin(step / 34 * 2 * math.pi) if sketch.station.active else 0.0
        wave.lineTo(SHUNT_X - 17 + step, WIRE_Y - height)
    color = "blue" if sketch.station.active else "ghost"
    sketch.painter.setPen(solid(sketch.colors.color(color), 3.0, round_ends=True))
    sketch.painter.setBrush(Qt.BrushStyle.NoBrush)
    sketch.painter.drawPath(wave)


def _amplifier(sketch: Sketch) -> None:
    sketch.line(0, WIRE_Y, 30, WIRE_Y)
    sketch.line(90, WIRE_Y, sketch.width, WIRE_Y)
    if sketch.bridge_tied:
        sketch.line(72, WIRE_Y + 12, 72, RETURN_Y)
        sketch.line(72, RETURN_Y, sketch.width, RETURN_Y)
    corners = [QPointF(28, WIRE_Y - 36), QPointF(28, WIRE_Y + 36), QPointF(92, WIRE_Y)]
    sketch.painter.drawPolygon(QPolygonF(corners))


def _load(sketch: Sketch) -> None:
    sketch.line(0, WIRE_Y, sketch.width, WIRE_Y)
    _shunt(sketch, SHUNT_X)
    if sketch.bridge_tied:
        sketch.line(0, RETURN_Y, sketch.width, RETURN_Y)
        sketch.node(SHUNT_X, RETURN_Y)


def _attenuator(sketch: Sketch) -> None:
    sketch.line(0, WIRE_Y, sketch.width, WIRE_Y)
    sketch.box(QRectF(8, WIRE_Y - 9, 38, 18))
    _shunt(sketch, 72)
    if sketch.bridge_tied:
        sketch.line(0, RETURN_Y, 72, RETURN_Y)
        sketch.box(QRectF(8, RETURN_Y - 9, 38, 18))
        sketch.node(72, RETURN_Y)


def _shunt(sketch: Sketch, x: float) -> None:
    end = RETURN_Y if sketch.bridge_tied else RETURN_Y - 10
    sketch.line(x, WIRE_Y, x, end)
    sketch.box(QRectF(x - 9, WIRE_Y + 18, 18, 38))
    sketch.node(x, WIRE_Y)
    if not sketch.bridge_tied:
        sketch.ground(x, end)


def _capture(sketch: Sketch) -> None:
    """Draw an analogue-to-digital converter: ∩ on the one side, # on the other."""
    body = QRectF(24, WIRE_Y - 30, 68, 60)
    sketch.line(0, WIRE_Y, body.left(), WIRE_Y)
    sketch.box(body)
    if sketch.station.hatched:
        hatch(sketch.painter, body, sketch.colors.color("ink"), 10)
        return
    sketch.line(body.left(), body.bottom(), body.right(), body.top())
    arch = QPainterPath(QPointF(body.left() + 11, WIRE_Y - 3))
    arch.cubicTo(body.left() + 11, WIRE_Y - 26, body.left() + 29, WIRE_Y - 26, body.left() + 29, WIRE_Y - 3)
    sketch.painter.setBrush(Qt.BrushStyle.NoBrush)
    sketch.painter.drawPath(arch)
    x, y = body.right() - 18, WIRE_Y + 16
    for shift in (-3.5, 3.5):
        sketch.line(x + shift - 1.5, y + 9, x + shift + 1.5, y - 9)
        sketch.line(x - 9, y + shift, x + 9, y + shift)


_DRAWN: dict[Place, Callable[[Sketch], None]] = {
    Place.TONE: _tone,
    Place.AMPLIFIER: _amplifier,
    Place.LOAD: _load,
    Place.ATTENUATOR: _attenuator,
    Place.CAPTURE: _capture,
}
