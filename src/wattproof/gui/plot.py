"""A plot's frame: title and grid drawn once into a picture, and only the live lines drawn on every frame."""

import numpy as np
from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QFontMetricsF, QPainter, QPaintEvent, QPixmap, QResizeEvent
from PySide6.QtWidgets import QWidget

from wattproof.gui.axes import Axis
from wattproof.gui.paths import Pixels, hair
from wattproof.gui.theme import Theme, Weight


class Plot(QWidget):
    """A titled plot. Heirs draw `draw_ground` (cached until something changes) and `draw_live` (every frame)."""

    def __init__(self, theme: Theme, title: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.theme = theme
        self.title = title
        self.about = ""
        self.show_about = True
        self.across = Axis(0.0, 1.0)
        self.up = Axis(0.0, 1.0)
        self.empty = ""
        self._ground: QPixmap | None = None
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self.setAccessibleName(title)
        theme.changed.connect(self.refresh)

    @property
    def area(self) -> QRectF:
        """The rectangle inside the axes, in pixels."""
        px = self.theme.px
        left = max(60.0, px(80))
        top = max(22.0, px(40))
        bottom = max(20.0, px(30))
        return QRectF(left, top, max(10.0, self.width() - left - 2), max(10.0, self.height() - top - bottom))

    def set_about(self, about: str) -> None:
        """Set the line beside the title."""
        if about != self.about:
            self.about = about
            self.refresh()

    def set_empty(self, words: str) -> None:
        """Set what is written where nothing is drawn."""
        if words != self.empty:
            self.empty = words
            self.update()

    def refresh(self) -> None:
        """Draw the ground anew."""
        self._ground = None
        self.update()

    def sizeHint(self) -> QSize:
        """Return a size for layouts; the window places plots itself."""
        return QSize(480, 240)

    def xs(self, values: Pixels, area: QRectF) -> Pixels:
        """Return the pixels of values along x."""
        return np.asarray(area.left() + self.across.place(values) * area.width())

    def ys(self, values: Pixels, area: QRectF) -> Pixels:
        """Return the pixels of values along y."""
        return np.asarray(area.bottom() - self.up.place(values) * area.height())

    def point(self, x: float, y: float, area: QRectF) -> QPointF:
        """Return the pixel of one point."""
        return QPointF(
            area.left() + self.across.spot(x) * area.width(), area.bottom() - self.up.spot(y) * area.height()
        )

    def ground(self, area: QRectF) -> QPixmap:
        """Return the cached ground, drawn where it is missing."""
        if self._ground is None:
            self._ground = self._painted_ground(area)
        return self._ground

    def draw_ground(self, painter: QPainter, area: QRectF) -> None:
        """Draw the grid and its labels. Heirs fill this."""

    def draw_live(self, painter: QPainter, area: QRectF) -> None:
        """Draw what changes with every frame, clipped to the area. Heirs fill this."""

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Forget the cached ground."""
        self._ground = None
        super().resizeEvent(event)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Put the cached ground down and draw the live lines over it."""
        area = self.area
        with QPainter(self) as painter:
            painter.drawPixmap(0, 0, self.ground(area))
            painter.setClipRect(area)
            self.draw_live(painter, area)

    def _painted_ground(self, area: QRectF) -> QPixmap:
        colors = self.theme.palette
        ratio = self.devicePixelRatioF()
        ground = QPixmap((self.size().toSizeF() * ratio).toSize())
        ground.setDevicePixelRatio(ratio)
        ground.fill(colors.color("ground"))  # opaque from the start: a picture with alpha is dearer to put down
        with QPainter(ground) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.setPen(hair(colors.color("line")))
            painter.setBrush(colors.color("paper"))
            painter.drawRect(area.adjusted(-0.5, -0.5, 0.5, 0.5))
            self._draw_title(painter, area)
            self.draw_ground(painter, area)
        return ground

    def _draw_title(self, painter: QPainter, area: QRectF) -> None:
        colors = self.theme.palette
        font = self.theme.font(22, Weight.BOLD)
        painter.setFont(font)
        painter.setPen(colors.color("ink"))
        baseline = area.top() - max(7.0, self.theme.px(13))
        painter.drawText(QPointF(area.left(), baseline), self.title)
        if not self.show_about:
            return
        left = area.left() + QFontMetricsF(font).horizontalAdvance(self.title) + self.theme.px(18)
        painter.setFont(self.theme.font(17))
        painter.setPen(colors.color("soft"))
        metrics = QFontMetricsF(self.theme.font(17))
        shown = metrics.elidedText(self.about, Qt.TextElideMode.ElideRight, max(0.0, area.right() - left))
        painter.drawText(QPointF(left, baseline), shown)

    def say_empty(self, painter: QPainter, area: QRectF, words: str = "") -> None:
        """Write in the middle why nothing is drawn."""
        painter.setFont(self.theme.font(20))
        painter.setPen(self.theme.palette.color("soft"))
        room = area.adjusted(area.width() * 0.1, 0, -area.width() * 0.1, 0)
        painter.drawText(room, Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextWordWrap, words or self.empty)

    def grid_x(self, painter: QPainter, area: QRectF, value: float, label: str = "") -> None:
        """Draw one vertical line of the grid with its label below."""
        x = round(area.left() + self.across.spot(value) * area.width()) + 0.5
        painter.setPen(hair(self.theme.palette.color("line")))
        painter.drawLine(QPointF(x, area.top()), QPointF(x, area.bottom()))
        if not label:
            return
        painter.setFont(self.theme.font(17))
        painter.setPen(self.theme.palette.color("soft"))
        width = QFontMetricsF(painter.font()).horizontalAdvance(label)
        left = min(max(x - width / 2, area.left()), area.right() - width)
        painter.drawText(QPointF(left, area.bottom() + QFontMetricsF(painter.font()).ascent() + 4), label)

    def grid_y(self, painter: QPainter, area: QRectF, value: float, label: str = "") -> None:
        """Draw one horizontal line of the grid with its label at the left."""
        y = round(area.bottom() - self.up.spot(value) * area.height()) + 0.5
        painter.setPen(hair(self.theme.palette.color("line")))
        painter.drawLine(QPointF(area.left(), y), QPointF(area.right(), y))
        if not label:
            return
        painter.setFont(self.theme.font(17))
        painter.setPen(self.theme.palette.color("soft"))
        box = QRectF(0, y - 12, area.left() - 8, 24)
        painter.drawText(box, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, label)
