"""The window's icon: the amplifier's triangle of the circuit diagram with a clipped wave, drawn and not stored."""

from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QIcon, QPainter, QPixmap, QPolygonF

from wattproof.gui.paths import solid
from wattproof.gui.theme import LIGHT

_SIZE = 128.0


def window_icon() -> QIcon:
    """Return the icon in one size; the desktop scales it."""
    picture = QPixmap(round(_SIZE), round(_SIZE))
    picture.fill(Qt.GlobalColor.transparent)
    with QPainter(picture) as painter:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(solid(LIGHT.color("ink"), 9, round_ends=True))
        painter.setBrush(LIGHT.color("paper"))
        painter.drawPolygon(QPolygonF([QPointF(16, 12), QPointF(16, 116), QPointF(114, 64)]))
        painter.setPen(solid(LIGHT.color("blue"), 9, round_ends=True))
        wave = [(26, 64), (33, 46), (47, 46), (54, 64), (61, 82), (72, 82), (80, 64)]
        painter.drawPolyline(QPolygonF([QPointF(x, y) for x, y in wave]))
    return QIcon(picture)
