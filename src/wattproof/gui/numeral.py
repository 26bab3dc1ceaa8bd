"""A figure to be read from two metres: label, number, unit and one line below, or what stands for a missing number."""

from PySide6.QtCore import QPointF, QRectF, Qt, Signal
from PySide6.QtGui import QFont, QFontMetricsF, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from wattproof.gui.paths import hatch
from wattproof.gui.readout import Figure, Withheld
from wattproof.gui.theme import Theme, Weight, exact_font

_UNIT_SHARE = 0.48  # of the number's height
_LABEL = 22
_ABOUT = 18
_SECOND, _SECOND_SMALL = 30, 25  # beside large and small numbers
_LARGE_FROM = 80
_BELOW = 20


class Numeral(QWidget):
    """Paints one Figure. `size` is the height of the number in units of the drawing. A click opens its budget."""

    opened = Signal()

    def __init__(self, theme: Theme, size: float, parent: QWidget) -> None:
        super().__init__(parent)
        self.theme = theme
        self.size_units = size
        self.figure = Figure("", "", "", "", Withheld.DASH)
        theme.changed.connect(self.update)

    def set_figure(self, figure: Figure) -> None:
        """Show a figure."""
        if figure != self.figure:
            self.figure = figure
            self.setAccessibleName(figure.label)
            self.setAccessibleDescription(figure.spoken)
            self.update()

    def text(self) -> str:
        """Return exactly what is painted, line by line."""
        figure = self.figure
        middle = "" if figure.withheld is Withheld.HATCH else f"{figure.number} {figure.unit}".strip()
        return "\n".join((f"{figure.label} {figure.about}".strip(), middle, f"{figure.second} {figure.below}".strip()))

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Open the budget."""
        self.opened.emit()
        event.accept()

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw label, number and unit, and the line below."""
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            label = self._draw_label(painter)
            below = self._draw_below(painter)
            room = QRectF(0, label, self.width(), self.height() - label - below)
            if self.figure.withheld is Withheld.HATCH:
                self._draw_hatching(painter, room)
            else:
                self._draw_number(painter, room)

    def _draw_label(self, painter: QPainter) -> float:
        """Draw the label and what stands beside it; return its height."""
        figure = self.figure
        painter.setPen(self.theme.palette.color("soft"))
        painter.setFont(self.theme.font(_LABEL, Weight.MEDIUM))
        metrics = QFontMetricsF(painter.font())
        painter.drawText(QPointF(0, metrics.ascent()), figure.label)
        left = metrics.horizontalAdvance(figure.label) + self.theme.px(14)
        painter.setFont(self.theme.font(_ABOUT))
        painter.drawText(QPointF(left, metrics.ascent()), self._fitting(painter, figure.about, left))
        return metrics.ascent()

    def _draw_below(self, painter: QPainter) -> float:
        """Draw the second unit and the uncertainty; return the height of their line."""
        figure, colors = self.figure, self.theme.palette
        second = _SECOND if self.size_units >= _LARGE_FROM else _SECOND_SMALL
        font = self.theme.font(second, Weight.BOLD) if figure.second else self.theme.font(_BELOW)
        painter.setFont(font)
        metrics = QFontMetricsF(font)
        baseline = self.height() - metrics.descent()
        left = 0.0
        if figure.second:
            painter.setPen(colors.color("ink"))
            painter.drawText(QPointF(0, baseline), figure.second)
            left = metrics.horizontalAdvance(figure.second) + self.theme.px(18)
        painter.setPen(colors.color("soft"))
        painter.setFont(self.theme.font(_BELOW))
        painter.drawText(QPointF(left, baseline), self._fitting(painter, figure.below, left))
        return metrics.height()

    def _fitting(self, painter: QPainter, words: str, left: float) -> str:
        metrics = QFontMetricsF(painter.font())
        return metrics.elidedText(words, Qt.TextElideMode.ElideRight, max(0.0, self.width() - left))

    def _draw_hatching(self, painter: QPainter, room: QRectF) -> None:
        inset = room.height() * 0.14
        area = room.adjusted(1, inset, -1 - room.width() * 0.12, -inset * 0.7)
        hatch(painter, area, self.theme.palette.color("ink"), max(8.0, self.theme.px(14)))

    def _draw_number(self, painter: QPainter, room: QRectF) -> None:
        figure, colors = self.figure, self.theme.palette
        number, unit = self._fonts(figure.number, figure.unit)
        missing = figure.withheld is Withheld.DASH
        painter.setPen(colors.color("soft" if missing else "ink"))
        painter.setFont(number)
        metrics = QFontMetricsF(number)
        baseline = room.center().y() + metrics.capHeight() / 2 + self.theme.px(2)
        # A digit's own side bearing grows with its size: take it back, so that labels and digits share one edge.
        left = -metrics.leftBearing(figure.number[0]) if figure.number else 0.0
        painter.drawText(QPointF(left, baseline), figure.number)
        painter.setFont(unit)
        gap = metrics.horizontalAdvance(figure.number) + left + metrics.capHeight() * 0.16
        painter.drawText(QPointF(gap, baseline), figure.unit)

    def _fonts(self, number: str, unit: str) -> tuple[QFont, QFont]:
        """Return fonts for number and unit, made smaller only where they would not fit."""
        size = self.theme.px(self.size_units)
        while True:
            missing = self.figure.withheld is Withheld.DASH
            big = exact_font(round(size * 0.6 if missing else size), Weight.REGULAR if missing else Weight.BOLD)
            small = exact_font(max(12, round(size * _UNIT_SHARE)), Weight.MEDIUM)
            metrics = QFontMetricsF(big)
            wide = metrics.horizontalAdvance(number) + QFontMetricsF(small).horizontalAdvance(unit)
            if wide + metrics.capHeight() * 0.2 <= self.width() or size < 14:
                return big, small
            size *= 0.94
