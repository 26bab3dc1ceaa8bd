"""Draws the trail of THD+N that the hand leaves behind, with the lines at 1 % and 10 % and a statement's marks."""

import math

from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QFontMetricsF, QPainter, QPen, QPixmap, QPolygonF
from PySide6.QtWidgets import QWidget

from wattproof.gui import axes, task_text, text
from wattproof.gui.axes import Axis
from wattproof.gui.paths import solid
from wattproof.gui.plot import Plot
from wattproof.gui.theme import Theme, Weight
from wattproof.gui.trail import Axis as Along
from wattproof.gui.trail import PointMark, Stroke, Trail

_START = {  # four decades to begin with; the axis grows by whole decades where a point needs it
    Along.POWER: Axis(0.01, 100.0, log=True),
    Along.VOLTS: Axis(0.1, 100.0, log=True),
    Along.FULL_SCALE: Axis(0.001, 1.0, log=True),
}
_UNIT = {Along.POWER: "W", Along.VOLTS: "V", Along.FULL_SCALE: "FS"}
_RATIO = Axis(1e-4, 0.3, log=True)
_FINE_GRID_DECADES = 5
_REACH = 100.0  # of the point of now with its word, in units of the drawing
_SAME = 0.02  # a mark this near to one of the two lines stands on it
_CLAIMS = (0.01, 0.10)  # the two distortions at which rated output is usually stated (IEC 60268-3, common practice)


class TrailPlot(Plot):
    """The largest picture. Each new piece of the stroke is drawn once, into the cached ground."""

    def __init__(self, theme: Theme, trail: Trail, parent: QWidget | None = None) -> None:
        super().__init__(theme, text.TRAIL, parent)
        self.trail = trail
        self.across, self.up = _START[Along.POWER], _RATIO
        self._along = Along.POWER
        self._drawn = 0
        self.floor: tuple[tuple[float, float], ...] = ()  # of the interface alone: x and plain ratio
        self._shown_now: tuple[float, float] | None = None
        self._version = -1

    @property
    def along(self) -> Along:
        """What the trail is drawn against."""
        return self._along

    def show_trail(self, trail: Trail) -> None:
        """Show another trail: the watch's, or that of a power statement."""
        if trail is not self.trail:
            self.trail = trail
            self._version = -1
            self.across, self.up = _START[self._along], _RATIO
            self.refresh()

    def show_floor(self, floor: tuple[tuple[float, float], ...]) -> None:
        """Shade the interface's own floor."""
        if floor != self.floor:
            self.floor = floor
            self.refresh()

    def follow(self) -> None:
        """Take in what the trail has gained since the last frame."""
        stroke = self.trail.current
        if stroke is not None and stroke.key.axis is not self._along:
            self._along = stroke.key.axis
            self.across = _START[self._along]
            self.refresh()
        for x, y in self._news():
            self._make_room(x, y)
        if self.trail.claimed_w is not None and self._along is Along.POWER:
            self._make_room(self.trail.claimed_w, _RATIO.high)
        if self.trail.version != self._version:
            self._version = self.trail.version
            self.refresh()
        self._update_changed()

    def _news(self) -> list[tuple[float, float]]:
        """Return the last point that is on the ground and those that are not yet."""
        stroke = self.trail.current
        return [] if stroke is None else stroke.since(max(0, self._drawn - 1))

    def _update_changed(self) -> None:
        """Ask for the part to be painted that is no longer right: old and new point of now, and the line between."""
        points, now = self._news(), self.trail.now
        if now == self._shown_now and len(points) < 2:
            return
        points += [point for point in (now, self._shown_now) if point is not None]
        self._shown_now = now
        area, reach = self.area, self.theme.px(_REACH)
        spots = [self.point(x, y, area) for x, y in points if not math.isnan(x)]
        if not spots or not self.trail.drawn:
            self.update()
            return
        left, right = min(spot.x() for spot in spots), max(spot.x() for spot in spots)
        top, bottom = min(spot.y() for spot in spots), max(spot.y() for spot in spots)
        changed = QRectF(left - reach, top - reach / 2, right - left + 2 * reach, bottom - top + reach)
        self.update(changed.toAlignedRect())

    def refresh(self) -> None:
        """Draw grid and strokes anew."""
        self._drawn = 0
        super().refresh()

    def _make_room(self, x: float, y: float) -> None:
        if math.isnan(x):
            return
        wider, taller = axes.widened(self.across, x), self.up
        while y < taller.low and taller.low > 1e-9:
            taller = Axis(taller.low / 10, taller.high, log=True)
        if y > taller.high and taller.high < 1.0:
            taller = Axis(taller.low, 1.0, log=True)
        if (wider, taller) != (self.across, self.up):
            self.across, self.up = wider, taller
            self.refresh()

    def draw_ground(self, painter: QPainter, area: QRectF) -> None:
        """Draw decades, their halves, and the two lines."""
        self._draw_floor(painter, area)
        unit = _UNIT[self._along]
        decades = axes.decades(self.across)
        if len(decades) <= _FINE_GRID_DECADES:
            for value in axes.between(self.across):
                self.grid_x(painter, area, value)
        for value in decades:
            last = value >= self.across.high * 0.99
            self.grid_x(painter, area, value, f"{value:g} {unit}" if last else f"{value:g}")
        for value in axes.decades(self.up):
            self.grid_y(painter, area, value, f"{100 * value:g} %")
        for claim in _CLAIMS:
            self._draw_claim(painter, area, claim)
        earlier = self.trail.earlier
        painter.save()
        if earlier is not None and earlier.key.axis is self._along:
            self._draw_stroke(painter, earlier, 1, area, "ghost")
        for stroke in self.trail.beside:
            self._draw_stroke(painter, stroke, 1, area, "blue", thin=True)
        self._draw_left_out(painter, area)
        painter.restore()
        if self.trail.claimed_w is not None and self._along is Along.POWER:
            self._draw_claimed(painter, area, self.trail.claimed_w)

    def _draw_floor(self, painter: QPainter, area: QRectF) -> None:
        if not self.floor:
            return
        painter.save()
        painter.setClipRect(area)
        line = [self.point(x, y, area) for x, y in self.floor]
        below = area.bottom() + 1
        outline = [QPointF(line[0].x(), below), *line, QPointF(line[-1].x(), below)]
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self.theme.palette.color("line"))
        painter.drawPolygon(QPolygonF(outline))
        painter.setFont(self.theme.font(16))
        painter.setPen(self.theme.palette.color("soft"))
        baseline = area.bottom() - self.theme.px(10)
        if line[0].y() < baseline - painter.fontMetrics().height():
            painter.drawText(QPointF(area.left() + self.theme.px(12), baseline), task_text.FLOOR)
        painter.restore()

    def _draw_claim(self, painter: QPainter, area: QRectF, claim: float) -> None:
        ink = self.theme.palette.color("ink")
        y = round(self.point(self.across.low, claim, area).y()) + 0.5
        pen = QPen(ink, max(1.5, self.theme.px(2)))
        pen.setDashPattern([1, 3])
        painter.setPen(pen)
        painter.drawLine(QPointF(area.left(), y), QPointF(area.right(), y))
        painter.setPen(ink)
        painter.setFont(self.theme.font(19, Weight.BOLD))
        painter.drawText(QPointF(area.left() + self.theme.px(12), y - self.theme.px(7)), text.claim(round(100 * claim)))

    def ground(self, area: QRectF) -> QPixmap:
        """Return the ground with the strokes on it as far as they have come."""
        ground = super().ground(area)
        stroke = self.trail.current
        if stroke is not None and len(stroke.x) > max(1, self._drawn):
            with QPainter(ground) as painter:
                self._draw_stroke(painter, stroke, max(1, self._drawn), area, "blue")
            self._drawn = len(stroke.x)
        return ground

    def draw_live(self, painter: QPainter, area: QRectF) -> None:
        """Draw the point of now."""
        for mark in self.trail.marks:
            self._draw_mark(painter, area, mark)
        if self.trail.now is not None:
            self._draw_now(painter, area, self.trail.now)
        elif not self.trail.drawn:
            self.say_empty(painter, area, text.TRAIL_EMPTY)

    def _draw_stroke(  # noqa: PLR0913 - a stroke is drawn whole or in part, in one of three ways
        self, painter: QPainter, stroke: Stroke, start: int, area: QRectF, color: str, *, thin: bool = False
    ) -> None:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setClipRect(area)
        width = max(1.0, self.theme.px(1.6)) if thin else max(1.8, self.theme.px(3.2 if color == "blue" else 2.2))
        painter.setPen(solid(self.theme.palette.color(color), width, round_ends=True))
        first = stroke.x[start - 1], stroke.y[start - 1]
        before = None if math.isnan(first[0]) else self.point(*first, area)
        for x, y in zip(stroke.x[start:], stroke.y[start:], strict=True):
            after = None if math.isnan(x) else self.point(x, y, area)
            if before is not None and after is not None:
                painter.drawLine(before, after)
            before = after
        if stroke.dotted and color == "blue":
            painter.setBrush(self.theme.palette.color("paper"))
            painter.setPen(solid(self.theme.palette.color(color), max(1.2, self.theme.px(1.8))))
            for x, y in zip(stroke.x, stroke.y, strict=True):
                painter.drawEllipse(self.point(x, y, area), self.theme.px(4) + 0.5, self.theme.px(4) + 0.5)

    def _draw_left_out(self, painter: QPainter, area: QRectF) -> None:
        """Draw a small grey cross for each reading that was left out."""
        painter.setPen(solid(self.theme.palette.color("soft"), 1.3))
        size = max(3.0, self.theme.px(5))
        for x, y in self.trail.left_out:
            spot = self.point(x, y, area)
            painter.drawLine(QLineF(spot.x() - size, spot.y() - size, spot.x() + size, spot.y() + size))
            painter.drawLine(QLineF(spot.x() - size, spot.y() + size, spot.x() + size, spot.y() - size))

    def _draw_claimed(self, painter: QPainter, area: QRectF, watts: float) -> None:
        """Draw the claimed power as a line of ink from top to bottom."""
        ink = self.theme.palette.color("ink")
        x = round(self.point(watts, self.up.low, area).x()) + 0.5
        painter.setPen(solid(ink, max(1.5, self.theme.px(2.2))))
        painter.drawLine(QPointF(x, area.top()), QPointF(x, area.bottom()))
        painter.setFont(self.theme.font(18, Weight.MEDIUM))
        words = task_text.CLAIM_LINE.format(watts=watts)
        metrics = QFontMetricsF(painter.font())
        gap = self.theme.px(8)
        left = x - gap - metrics.horizontalAdvance(words)
        self._write(
            painter, QPointF(left if left > area.left() + gap else x + gap, area.top() + metrics.ascent() + 2), words
        )

    def _draw_mark(self, painter: QPainter, area: QRectF, mark: PointMark) -> None:
        """Draw one point of the statement: filled where it was held, open where it is momentary."""
        colors, px = self.theme.palette, self.theme.px
        spot, radius = self.point(mark.x, mark.y, area), max(4.5, px(7.5))
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        claimed = any(abs(mark.y / claim - 1.0) < _SAME for claim in _CLAIMS)
        lift = px(9) if claimed else px(46)
        if not claimed:
            pen = QPen(colors.color("ink"), max(1.2, px(1.6)))
            pen.setDashPattern([1, 3])
            painter.setPen(pen)
            painter.drawLine(spot, QPointF(spot.x(), spot.y() - lift - px(18)))
        painter.setPen(solid(colors.color("ink"), max(1.6, px(2.4))))
        painter.setBrush(colors.color("ink" if mark.held else "paper"))
        painter.drawEllipse(spot, radius, radius)
        painter.setPen(colors.color("ink"))
        painter.setFont(self.theme.font(18, Weight.BOLD))
        words = mark.words if claimed else f"{mark.name} {mark.words}"
        width = QFontMetricsF(painter.font()).horizontalAdvance(words)
        left = spot.x() - radius - px(8) - width
        if left < area.left() + px(70):
            left = min(spot.x() + radius + px(8), area.right() - width - 4)
        self._write(painter, QPointF(left, spot.y() - lift), words)

    def _write(self, painter: QPainter, at: QPointF, words: str) -> None:
        """Write on a piece of paper of its own, so that no line runs through the words."""
        metrics = QFontMetricsF(painter.font())
        back = QRectF(at.x() - 4, at.y() - metrics.ascent(), metrics.horizontalAdvance(words) + 8, metrics.height())
        painter.fillRect(back, self.theme.palette.color("paper"))
        painter.drawText(at, words)

    def _draw_now(self, painter: QPainter, area: QRectF, now: tuple[float, float]) -> None:
        spot = self.point(*now, area)
        if not area.contains(spot):
            return
        colors = self.theme.palette
        radius = max(5.0, self.theme.px(9))
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(solid(colors.color("paper"), max(1.5, self.theme.px(2.5))))
        painter.setBrush(colors.color("blue"))
        painter.drawEllipse(spot, radius, radius)
        painter.setFont(self.theme.font(19, Weight.BOLD))
        painter.setPen(colors.color("blue"))
        width = QFontMetricsF(painter.font()).horizontalAdvance(text.NOW)
        right = spot.x() + 2 * radius + width < area.right()
        left = spot.x() + 1.6 * radius if right else spot.x() - 1.6 * radius - width
        painter.drawText(QPointF(left, min(spot.y() + 2.2 * radius, area.bottom() - 6)), text.NOW)
