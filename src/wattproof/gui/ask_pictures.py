"""Draws what a person is asked to do, in the trade's own symbols: a control, a load, a plug, somebody beside it."""

import math

from PySide6.QtCore import QPointF, QRectF, QSize
from PySide6.QtGui import QPainter, QPaintEvent, QPolygonF
from PySide6.QtWidgets import QWidget

from wattproof.gui.picture_pen import Pen
from wattproof.gui.plug_pictures import draw_plugged
from wattproof.gui.theme import Theme
from wattproof.procedures.calibrate import METER
from wattproof.procedures.driving import HERE
from wattproof.procedures.power_switching import BACK, DOWN, FULL, LEAVE, UP
from wattproof.procedures.requests import Action, Ask

_WIDE, _HIGH = 330.0, 120.0  # the drawing's own units
_LOW_DEG, _FULL_DEG = 225.0, -45.0  # where a volume control's pointer stands, anticlockwise from the right


class AskPicture(QWidget):
    """Shows one picture, as large as fits."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.theme = theme
        self.ask: Ask | None = None
        theme.changed.connect(self.update)

    def sizeHint(self) -> QSize:
        """Return a size that can be understood from two metres."""
        return QSize(200, round(max(74, self.theme.px(120))))

    def show_ask(self, ask: Ask | None) -> None:
        """Show what is asked."""
        self.ask = ask
        self.setMinimumHeight(self.sizeHint().height())
        self.update()

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw the picture in the middle."""
        if self.ask is None:
            return
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            scale = min(self.width() / _WIDE, self.height() / _HIGH)
            painter.translate((self.width() - scale * _WIDE) / 2, (self.height() - scale * _HIGH) / 2)
            painter.scale(scale, scale)
            pen = Pen(painter, self.theme.palette, self.theme)
            pen.ink()
            draw_ask(self.ask, pen)


def draw_ask(ask: Ask, pen: Pen) -> None:
    """Draw what is asked, in a field of 330 by 120."""
    match ask:
        case Ask(action=Action.TURN, want=want):
            _turn(pen, str(want))
        case Ask(action=Action.CONFIRM, want=want) if want == HERE:
            _somebody(pen)
        case Ask(action=Action.CONFIRM, want=want, check=check) if want == METER:
            draw_plugged(pen, METER, check)
        case Ask(action=Action.CONNECT, want=want, check=check):
            draw_plugged(pen, str(want), check)
        case Ask(action=Action.CONFIRM, want=want):
            _load_not_loudspeaker(pen, f"{want} Ω")
        case Ask(action=Action.SWITCH_LOAD, want=want):
            _switch(pen, f"{want:g} Ω")
        case Ask(action=Action.SWITCH_CHANNEL, want=want):
            _plug(pen, f"{want:g}")
        case _:
            pass


def _turn(pen: Pen, want: str) -> None:
    """Draw a volume control with its pointer where it is, and an arrow to where it shall go, if anywhere."""
    x, y, r = 165.0, 66.0, 34.0
    start, end = {FULL: (_LOW_DEG, _FULL_DEG), UP: (_LOW_DEG, _FULL_DEG)}.get(want, (_FULL_DEG, _LOW_DEG))
    at_rest = {FULL: _FULL_DEG, DOWN: _LOW_DEG, UP: _LOW_DEG, BACK: _FULL_DEG, LEAVE: 60.0}.get(want, _LOW_DEG)
    pen.painter.setBrush(pen.colors.color("ground"))
    pen.painter.drawEllipse(QPointF(x, y), r, r)
    angle = math.radians(at_rest)
    pen.ink("ink", 4.0)
    pen.line(
        x + 0.35 * r * math.cos(angle), y - 0.35 * r * math.sin(angle), x + r * math.cos(angle), y - r * math.sin(angle)
    )
    if want != LEAVE:
        _draw_way(pen, QPointF(x, y), r + 14, (start, end))
    pen.ink()
    pen.words(x - 62, y + 44, "0")
    pen.words(x + 66, y + 44, "full")


def _draw_way(pen: Pen, middle: QPointF, outer: float, way_deg: tuple[float, float]) -> None:
    """Draw the arrow around a control."""
    x, y = middle.x(), middle.y()
    start, end = way_deg
    pen.ink("blue", 3.2)
    way = 1 if end > start else -1
    first, last = start + 18 * way, end - 14 * way
    pen.painter.drawArc(
        QRectF(x - outer, y - outer, 2 * outer, 2 * outer), round(16 * first), round(16 * (last - first))
    )
    tip = math.radians(end - 8 * way)
    pen.arrow(QPointF(x + outer * math.cos(tip), y - outer * math.sin(tip)), end - 8 * way + 90 * way)


def _resistor(pen: Pen, x: float, y: float) -> None:
    """Draw a resistor upright, its body 24 by 60, about a point (IEC 60617)."""
    pen.line(x, y - 48, x, y - 30)
    pen.line(x, y + 30, x, y + 48)
    pen.painter.drawRect(QRectF(x - 12, y - 30, 24, 60))


def _load_not_loudspeaker(pen: Pen, ohm: str) -> None:
    _resistor(pen, 82, 60)
    pen.words(112, 66, ohm, bold=True, middle=False)
    pen.ink("blue", 4.0)
    pen.line(26, 62, 36, 74)
    pen.line(36, 74, 56, 44)
    pen.ink()
    x, y = 244.0, 60.0
    pen.painter.drawRect(QRectF(x - 14, y - 18, 14, 36))
    horn = [QPointF(x, y - 18), QPointF(x + 26, y - 40), QPointF(x + 26, y + 40), QPointF(x, y + 18)]
    pen.painter.drawPolygon(QPolygonF(horn))
    pen.ink("ink", 5.0)
    pen.line(x - 26, y + 44, x + 40, y - 44)


def _switch(pen: Pen, ohm: str) -> None:
    """Draw a changeover switch whose arm leads to the load that is wanted."""
    pen.line(20, 60, 96, 60)
    pen.painter.drawEllipse(QPointF(100, 60), 4, 4)
    for y in (28.0, 92.0):
        pen.painter.drawEllipse(QPointF(176, y), 4, 4)
        pen.line(180, y, 206, y)
        pen.painter.drawRect(QRectF(206, y - 11, 56, 22))
        pen.line(262, y, 300, y)
    pen.line(300, 28, 300, 92)
    pen.ink("blue", 4.0)
    pen.line(104, 60, 173, 30)
    pen.ink()
    pen.words(234, 16 - 2, ohm, bold=True)


def _plug(pen: Pen, channel: str) -> None:
    """Draw two sockets and a plug that goes to the one that is wanted."""
    first = channel == "1"
    for number, x in ((1, 110.0), (2, 220.0)):
        pen.painter.drawEllipse(QPointF(x, 34), 20, 20)
        pen.painter.drawEllipse(QPointF(x, 34), 6, 6)
        pen.words(x, 76, str(number) if number < 2 or first else channel, bold=str(number) == channel or number > 1)
    x = 110.0 if first else 220.0
    pen.ink("blue", 4.0)
    pen.line(x, 116, x, 90)
    pen.arrow(QPointF(x, 82), 90)


def _somebody(pen: Pen) -> None:
    """Draw somebody beside a warm load."""
    pen.painter.drawEllipse(QPointF(110, 34), 17, 17)
    pen.painter.drawArc(QRectF(76, 62, 68, 100), 0, 180 * 16)
    _resistor(pen, 220, 68)
    pen.ink("ink", 2.0)
    for x in (206.0, 220.0, 234.0):
        pen.line(x - 4, 14, x + 4, 4)
