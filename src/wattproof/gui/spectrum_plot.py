"""Draws the harmonic spectrum: sticks for harmonics with their orders, named hum lines, a thin line for noise."""

import numpy as np
from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QFont, QFontMetricsF, QPainter, QStaticText
from PySide6.QtWidgets import QWidget

from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, Remark, State
from wattproof.core.units import db
from wattproof.gui import text
from wattproof.gui.axes import Axis
from wattproof.gui.figures import MINUS, frequency
from wattproof.gui.paths import draw_bold, polyline, solid, thinned
from wattproof.gui.plot import Plot
from wattproof.gui.theme import Theme, Weight

_FLOOR_DB = -150.0
_STEP_DB = 30
_NAMED_HUM_LINES = 2
_MOST_SHAPES = 200
_TOP_DB = 6.0  # a little air above the tone
_LABELLED = (20.0, 50.0, 100.0, 200.0, 500.0, 1e3, 2e3, 5e3, 10e3, 20e3)


class SpectrumPlot(Plot):
    """The residual's lines and noise in dB below the tone, on axes that stay where they are."""

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        self._shapes: dict[str, QStaticText] = {}
        super().__init__(theme, text.SPECTRUM, parent)
        self.across = Axis(20.0, 20e3, log=True)
        self.up = Axis(_FLOOR_DB, _TOP_DB)
        self.about = text.SPECTRUM_ABOUT
        self.picture: Picture | None = None

    def follow(self, picture: Picture | None) -> None:
        """Take the newest picture, or none where nothing honest is there to draw."""
        self.picture = picture
        if picture is not None:
            low, high = picture.reading.settings.band_hz
            wanted = Axis(max(low, 1.0), high, log=True)
            if wanted != self.across:
                self.across = wanted
                self.refresh()
            self.set_about(text.spectrum_about(picture.noise_bandwidth_hz, picture.window))
        self.update()

    def draw_ground(self, painter: QPainter, area: QRectF) -> None:
        """Draw decades of frequency and steps of 30 dB."""
        for exponent in range(6):
            for multiple in range(1, 10):
                value = multiple * 10.0**exponent
                if self.across.low <= value <= self.across.high:
                    self.grid_x(painter, area, value, self._label(value))
        for level in range(0, round(_FLOOR_DB) - 1, -_STEP_DB):
            self.grid_y(painter, area, level, f"{level} dB".replace("-", MINUS) if level == 0 else f"{MINUS}{-level}")

    def _label(self, value: float) -> str:
        if value not in _LABELLED or (self.width() < 460 and value not in (20.0, 100.0, 1e3, 10e3)):
            return ""
        if value == 20e3 and self.width() < 760:
            return ""
        words = f"{value:g}" if value < 1e3 else f"{value / 1e3:g} k"
        return f"{words} Hz" if value == 20.0 else words

    def draw_live(self, painter: QPainter, area: QRectF) -> None:
        """Draw noise, hum, tone and harmonics."""
        picture = self.picture
        if picture is None:
            self.say_empty(painter, area)
            return
        colors = self.theme.palette
        if len(picture.spectrum_hz):
            levels = 20 * np.log10(np.maximum(picture.spectrum_ratio, 1e-12))
            x, y = thinned(self.xs(picture.spectrum_hz, area), self.ys(levels, area), int(area.width()))
            draw_bold(painter, polyline(x, y), colors.color("soft"), 1.0)
        if picture.reading.state is State.OK:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing, on=False)
            self._draw_sticks(painter, area, picture.reading)

    def _draw_sticks(self, painter: QPainter, area: QRectF, reading: Reading) -> None:
        seen = [(h.frequency_hz, h.ratio.value) for h in reading.harmonics if h.remark is not Remark.NOT_SEEN]
        hum = [(line.frequency_hz, line.ratio.value) for line in reading.mains.lines]
        tone = [(reading.fundamental_hz.value, 1.0)] if reading.fundamental_hz is not None else []
        for lines, color, width in ((hum, "soft", 2.0), (seen, "blue", 4.0), (tone, "ink", 5.0)):
            tops = [self.point(hertz, db(ratio), area) for hertz, ratio in lines if self._visible(hertz, ratio)]
            painter.setPen(solid(self.theme.palette.color(color), max(1.0, round(self.theme.px(width)))))
            painter.drawLines([QLineF(top.x(), area.bottom(), top.x(), top.y()) for top in tops])
        self._draw_names(painter, area, reading)

    def _visible(self, hertz: float, ratio: float) -> bool:
        return ratio > 0 and self.across.low <= hertz <= self.across.high

    def _draw_names(self, painter: QPainter, area: QRectF, reading: Reading) -> None:
        """Name the strongest first; a name that would run into another name or stick is left out."""
        painter.setFont(self.theme.font(18, Weight.BOLD))
        metrics = QFontMetricsF(painter.font())
        height = metrics.height()
        names = self._names(reading, area)
        taken: list[tuple[float, float, float]] = []
        for name, x, y, color in names:
            shaped = self._shaped(name, painter.font())
            half = shaped.size().width() / 2
            bottom = max(y - 1, area.top() + 1 + height)
            left = min(max(x - half, area.left() + 2), area.right() - 2 * half - 2)
            low, high = left - 3, left + 2 * half + 3
            crossed = any(low < other < high and other != x and top < bottom for _, other, top, _ in names)
            covered = any(low < end and begin < high and abs(bottom - at) < height for begin, end, at in taken)
            if not crossed and not covered:
                taken.append((low, high, bottom))
                painter.setPen(self.theme.palette.color(color))
                painter.drawStaticText(QPointF(left, bottom - height), shaped)

    def _shaped(self, name: str, font: QFont) -> QStaticText:
        """Return a name with its letters already placed: half the cost of a frame would go into shaping them anew."""
        if len(self._shapes) > _MOST_SHAPES:
            self._shapes.clear()
        if name not in self._shapes:
            self._shapes[name] = QStaticText(name)
            self._shapes[name].setTextFormat(Qt.TextFormat.PlainText)
            self._shapes[name].prepare(font=font)
        return self._shapes[name]

    def refresh(self) -> None:
        """Draw the ground anew, and shape the names anew."""
        self._shapes.clear()
        super().refresh()

    def _names(self, reading: Reading, area: QRectF) -> list[tuple[str, float, float, str]]:
        """Return name, place in pixels and colour of harmonics and hum lines, the strongest of each first."""
        found = [
            (str(h.order), h.frequency_hz, h.ratio.value, "ink")
            for h in sorted(reading.harmonics, key=lambda h: -h.ratio.value)
            if h.remark is not Remark.NOT_SEEN
        ]
        lines = sorted(reading.mains.lines, key=lambda line: -line.ratio.value)[:_NAMED_HUM_LINES]
        found += [
            (text.hum_line(frequency(round(line.frequency_hz, 1))), line.frequency_hz, line.ratio.value, "soft")
            for line in lines
        ]
        placed = []
        for name, hertz, ratio, color in found:
            if self._visible(hertz, ratio):
                spot = self.point(hertz, db(ratio), area)
                placed.append((name, spot.x(), spot.y(), color))
        return placed
