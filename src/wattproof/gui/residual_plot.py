"""Draws the residual waveform locked to the tone's phase, with the output's own shape ghosted behind."""

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter
from PySide6.QtWidgets import QWidget

from wattproof.core.picture import Picture
from wattproof.gui import text
from wattproof.gui.axes import Axis, tidy
from wattproof.gui.figures import MINUS
from wattproof.gui.paths import draw_bold, polyline, thinned
from wattproof.gui.plot import Plot
from wattproof.gui.theme import Theme

_PERIODS = 2.0
_GHOST_FILLS = 0.86  # of half the height, for the fundamental's peak
_SHRINK_BELOW = 0.35  # of the scale; and only after a while, so that the axis does not flutter
_PATIENCE_FRAMES = 20


class ResidualPlot(Plot):
    """Two periods of what is left over the tone, in per cent of the tone's peak."""

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(theme, text.RESIDUAL, parent)
        self.across = Axis(0.0, _PERIODS)
        self.up = Axis(-0.01, 0.01)
        self.about = text.RESIDUAL_ABOUT
        self.picture: Picture | None = None
        self._small = 0

    def follow(self, picture: Picture | None) -> None:
        """Take the newest picture, or none where nothing honest is there to draw."""
        self.picture = picture
        if picture is not None and len(picture.residual):
            self._fit_scale(float(np.abs(picture.residual).max()))
        self.update()

    def _fit_scale(self, peak: float) -> None:
        wanted = tidy(peak * 1.05)
        scale = self.up.high
        self._small = self._small + 1 if peak < _SHRINK_BELOW * scale else 0
        if wanted > scale or (self._small > _PATIENCE_FRAMES and wanted < scale):
            self._small = 0
            self.up = Axis(-wanted, wanted)
            self.refresh()

    def draw_ground(self, painter: QPainter, area: QRectF) -> None:
        """Draw half periods, zero and the scale."""
        for quarter in range(9):
            labelled = quarter % 2 == 0
            self.grid_x(painter, area, quarter / 4, f"{90 * quarter}°" if labelled else "")
        scale = 100 * self.up.high
        self.grid_y(painter, area, self.up.high / 2)
        self.grid_y(painter, area, self.up.low / 2)
        self.grid_y(painter, area, 0.0, "0")
        self.grid_y(painter, area, self.up.high * 0.999, f"+{scale:g} %")
        self.grid_y(painter, area, self.up.low * 0.999, f"{MINUS}{scale:g} %")

    def draw_live(self, painter: QPainter, area: QRectF) -> None:
        """Draw the ghost and the residual."""
        picture = self.picture
        if picture is None or not len(picture.residual):
            self.say_empty(painter, area)
            return
        colors = self.theme.palette
        width = max(1, int(area.width()))
        x = self.xs(picture.phase_cycles, area)
        middle = area.center().y()
        ghost = middle - picture.output * (area.height() / 2 * _GHOST_FILLS)
        draw_bold(painter, polyline(*thinned(x, ghost, width)), colors.color("ghost"), max(1.4, self.theme.px(1.8)))
        line = self.ys(picture.residual, area)
        draw_bold(painter, polyline(*thinned(x, line, width)), colors.color("blue"), max(1.6, self.theme.px(2.4)))
