"""What the pictures of the questions are drawn with, in a field of 330 by 120 units."""

import math

import attrs
from PySide6.QtCore import QLineF, QPointF, Qt
from PySide6.QtGui import QPainter, QPolygonF

from wattproof.gui.paths import solid
from wattproof.gui.theme import Palette, Theme, Weight

_INK = 2.4


@attrs.frozen
class Pen:
    """What a picture draws with."""

    painter: QPainter
    colors: Palette
    theme: Theme

    def ink(self, color: str = "ink", width: float = _INK) -> None:
        """Take a colour."""
        self.painter.setPen(solid(self.colors.color(color), width, round_ends=True))
        self.painter.setBrush(Qt.BrushStyle.NoBrush)

    def line(self, x1: float, y1: float, x2: float, y2: float) -> None:
        """Draw a line."""
        self.painter.drawLine(QLineF(x1, y1, x2, y2))

    def words(self, x: float, y: float, words: str, *, bold: bool = False, middle: bool = True) -> None:
        """Write words about a point, at a size that can be read whatever the scale."""
        self.painter.save()
        place = self.painter.transform().map(QPointF(x, y))
        self.painter.resetTransform()
        self.painter.setFont(self.theme.font(18, Weight.BOLD if bold else Weight.REGULAR))
        width = self.painter.fontMetrics().horizontalAdvance(words)
        left = place.x() - width / 2 if middle else place.x()
        self.painter.drawText(QPointF(left, place.y()), words)
        self.painter.restore()

    def arrow(self, tip: QPointF, degrees: float) -> None:
        """Draw an arrow's head that points along an angle."""
        size, spread = 11.0, math.radians(26)
        back = math.radians(degrees) + math.pi
        sides = [tip + QPointF(size * math.cos(back + s), -size * math.sin(back + s)) for s in (spread, -spread)]
        self.painter.setBrush(self.painter.pen().color())
        self.painter.drawPolygon(QPolygonF([tip, *sides]))
        self.painter.setBrush(Qt.BrushStyle.NoBrush)
