"""The chain as it is wired on the table: at once picture, status and menu."""

from collections.abc import Mapping

from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QFontMetricsF, QKeyEvent, QPainter, QPaintEvent, QResizeEvent, QWheelEvent
from PySide6.QtWidgets import QAbstractButton, QWidget

from wattproof.gui import text
from wattproof.gui.paths import hatch, solid
from wattproof.gui.stations import Place, Station
from wattproof.gui.symbols import SYMBOL_RIGHT, WIRE_Y, Sketch, draw_symbol
from wattproof.gui.theme import Theme, Weight

_DETENT = 120  # Qt counts a wheel's step as 120 eighths of a degree


class StationButton(QAbstractButton):
    """One station. Click, Return or its number opens its settings; the wheel is handed on."""

    turned = Signal(float)

    def __init__(self, theme: Theme, place: Place, parent: QWidget) -> None:
        super().__init__(parent)
        self.theme = theme
        self.place = place
        self.station = Station(place.value, "")
        self.bridge_tied = False
        self.compact = False
        self.chosen = False
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setAttribute(Qt.WidgetAttribute.WA_Hover)
        theme.changed.connect(self.update)

    def set_station(self, station: Station, *, bridge_tied: bool) -> None:
        """Show a station's newest figures."""
        if station == self.station and bridge_tied == self.bridge_tied:
            return
        self.station = station
        self.bridge_tied = bridge_tied
        self.setAccessibleName(text.spoken(station.label, station.figure, station.below))
        self.setAccessibleDescription(text.OPENS)
        self.update()

    def sizeHint(self) -> QSize:
        """Return a size for layouts; the chain places stations itself."""
        return QSize(200, 100)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Open on Return; leave up and down to the knob, left and right to the neighbours."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
        elif event.key() in (Qt.Key.Key_Up, Qt.Key.Key_Down, Qt.Key.Key_Space):
            event.ignore()
        else:
            super().keyPressEvent(event)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Tell how many steps the wheel was turned."""
        self.turned.emit(event.angleDelta().y() / _DETENT)
        event.accept()

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw wires, symbol, label and figure."""
        colors = self.theme.palette
        scale = self.theme.scale
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.fillRect(self.rect(), colors.color("ground"))
            self._draw_state(painter)
            painter.save()
            painter.scale(scale, scale)
            draw_symbol(self.place, Sketch(painter, colors, self.station, self.width() / scale, self.bridge_tied))
            painter.restore()
            self._draw_words(painter)

    def _draw_state(self, painter: QPainter) -> None:
        colors = self.theme.palette
        frame = QRectF(self.rect()).adjusted(3, 2, -3, -2)
        if self.underMouse() or self.chosen:
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(colors.color("paper"))
            painter.drawRoundedRect(frame, 8, 8)
        if self.chosen:
            bar = QRectF(frame.left() + 8, frame.bottom() - 3, frame.width() - 16, 3)
            painter.fillRect(bar, colors.color("ink"))
        if self.hasFocus():
            painter.setPen(solid(colors.color("blue"), 2))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRoundedRect(frame, 8, 8)

    def _draw_words(self, painter: QPainter) -> None:
        colors, px, station = self.theme.palette, self.theme.px, self.station
        left = px(SYMBOL_RIGHT + 12)
        room = self.width() - left - 6
        painter.setFont(self.theme.font(17, Weight.MEDIUM))
        painter.setPen(colors.color("soft"))
        painter.drawText(QPointF(left, px(WIRE_Y - 20)), _elided(painter, station.label, room))
        figure_font = self.theme.font(28, Weight.BOLD)
        painter.setFont(figure_font)
        painter.setPen(colors.color("ink"))
        baseline = px(WIRE_Y) + max(px(40), QFontMetricsF(figure_font).ascent() + 4)
        painter.drawText(QPointF(left, baseline), _elided(painter, station.figure, room))
        if station.filled is not None:
            self._draw_meter(painter, QRectF(left, px(WIRE_Y) - px(4), room * 0.72, px(8)))
        if self.compact and not station.warned:
            return
        painter.setFont(self.theme.font(17, Weight.BOLD if station.warned else Weight.REGULAR))
        painter.setPen(colors.color("warn" if station.warned else "soft"))
        below = ("▲ " if station.warned else "") + station.below
        painter.drawText(QPointF(left, baseline + max(px(28), 17)), _elided(painter, below, room))

    def _draw_meter(self, painter: QPainter, bar: QRectF) -> None:
        colors, station = self.theme.palette, self.station
        if station.hatched:
            hatch(painter, bar, colors.color("ink"), self.theme.px(8))
            return
        painter.setPen(solid(colors.color("soft"), 1))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawRect(bar)
        painter.fillRect(bar.adjusted(0, 0, -bar.width() * (1 - (station.filled or 0.0)), 0), colors.color("blue"))


def _elided(painter: QPainter, words: str, room: float) -> str:
    return QFontMetricsF(painter.font()).elidedText(words, Qt.TextElideMode.ElideRight, max(0.0, room))


class Chain(QWidget):
    """The five stations side by side, with one wire through them."""

    opened = Signal(str)
    turned = Signal(str, float)

    def __init__(self, theme: Theme, parent: QWidget) -> None:
        super().__init__(parent)
        self.buttons = {place: StationButton(theme, place, self) for place in Place}
        for place, button in self.buttons.items():
            button.clicked.connect(lambda _=False, at=place: self.opened.emit(at.value))
            button.turned.connect(lambda steps, at=place: self.turned.emit(at.value, steps))

    def show_stations(self, stations: Mapping[Place, Station], *, bridge_tied: bool) -> None:
        """Show the newest figures."""
        for place, station in stations.items():
            self.buttons[place].set_station(station, bridge_tied=bridge_tied)

    def choose(self, place: Place | None) -> None:
        """Mark the station whose settings are open, or none."""
        for at, button in self.buttons.items():
            button.chosen = at is place
            button.update()

    def set_compact(self, *, compact: bool) -> None:
        """Drop the stations' second lines, or bring them back."""
        for button in self.buttons.values():
            button.compact = compact

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Share the width without a hole, so that the wire runs through."""
        edges = [round(index * self.width() / len(self.buttons)) for index in range(len(self.buttons) + 1)]
        for index, button in enumerate(self.buttons.values()):
            button.setGeometry(edges[index], 0, edges[index + 1] - edges[index], self.height())
        super().resizeEvent(event)
