"""The parts of the window and where they stand: it shows what it is given and decides nothing."""

from PySide6.QtCore import Qt
from PySide6.QtGui import QResizeEvent
from PySide6.QtWidgets import QLabel, QWidget

from wattproof.core.picture import Picture
from wattproof.gui.budget_card import BudgetCard
from wattproof.gui.chain import Chain
from wattproof.gui.controls import FlatButton
from wattproof.gui.numeral import Numeral
from wattproof.gui.panel import Panel
from wattproof.gui.plan import Box, plan_for
from wattproof.gui.readout import Readout
from wattproof.gui.residual_plot import ResidualPlot
from wattproof.gui.spectrum_plot import SpectrumPlot
from wattproof.gui.theme import Theme
from wattproof.gui.trail import Trail
from wattproof.gui.trail_plot import TrailPlot
from wattproof.gui.verdict import Verdict


class Face(QWidget):
    """Everything inside the window."""

    def __init__(self, theme: Theme, trail: Trail, parent: QWidget) -> None:
        super().__init__(parent)
        self.theme = theme
        self.setFocusPolicy(Qt.FocusPolicy.ClickFocus)  # a click beside everything leaves a field
        self.chain = Chain(theme, self)
        self.thdn = Numeral(theme, 122, self)
        self.power = Numeral(theme, 96, self)
        self.level = Numeral(theme, 46, self)
        self.frequency = Numeral(theme, 46, self)
        self.verdict = Verdict(theme, self)
        self.trail = TrailPlot(theme, trail, self)
        self.residual = ResidualPlot(theme, self)
        self.spectrum = SpectrumPlot(theme, self)
        self.panel = Panel(theme, self)
        self.sheet: QWidget | None = None
        self.budget = BudgetCard(self)
        for numeral in (self.thdn, self.power, self.level, self.frequency):
            numeral.opened.connect(lambda each=numeral: self.open_budget(each))
        self.foot = QLabel(self)
        self.foot.setProperty("kind", "foot")
        self.theme_button = FlatButton(theme, "")
        self.theme_button.setParent(self)

    def show_readout(self, readout: Readout, *, sentence_too: bool) -> None:
        """Show figures, and the sentence where it is time for it."""
        self.thdn.set_figure(readout.thdn)
        self.power.set_figure(readout.power)
        self.level.set_figure(readout.level)
        self.frequency.set_figure(readout.frequency)
        if sentence_too or readout.sentence.mark is not self.verdict.sentence.mark:
            self.verdict.set_sentence(readout.sentence)
            self.residual.set_empty(readout.sentence.title)
            self.spectrum.set_empty(readout.sentence.title)

    def open_budget(self, numeral: Numeral) -> None:
        """Open the budget of one of the four figures."""
        self.budget.open_for(numeral, numeral.figure.label, numeral.figure.quantity)

    def next_budget(self) -> None:
        """Open the budget of the first figure, then of each next one, then none."""
        numerals = [self.thdn, self.power, self.level, self.frequency]
        at = numerals.index(self.budget.owner) + 1 if self.budget.owner in numerals else 0
        known = [each for each in numerals[at:] if each.figure.quantity is not None]
        if known:
            self.open_budget(known[0])
        else:
            self.budget.put_away()

    def show_picture(self, residual: Picture | None, spectrum: Picture | None) -> None:
        """Show the two live plots of a block, None where there is nothing honest to draw."""
        self.residual.follow(residual)
        self.spectrum.follow(spectrum)

    def show_sheet(self, sheet: QWidget | None) -> None:
        """Put a task's own sheet where reading and plots are, or take it away."""
        if self.sheet is not None and self.sheet is not sheet:
            self.sheet.hide()
        self.sheet = sheet
        for widget in (self.thdn, self.power, self.level, self.frequency, self.verdict):
            widget.setVisible(sheet is None)
        for plot in (self.trail, self.residual, self.spectrum):
            plot.setVisible(sheet is None)
        if sheet is not None:
            sheet.setParent(self)
            sheet.setGeometry(*plan_for(self.width(), self.height()).sheet)
            sheet.show()

    def set_theme_words(self, words: str) -> None:
        """Say which theme is chosen."""
        self.theme_button.setText(words)
        self.theme_button.setAccessibleName(words)
        self._place()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Place everything anew."""
        super().resizeEvent(event)
        self._place()

    def _place(self) -> None:
        plan = plan_for(self.width(), self.height())
        self.theme.set_scale(plan.scale)
        placed: tuple[tuple[QWidget, Box], ...] = (
            (self.chain, plan.chain),
            (self.thdn, plan.thdn),
            (self.power, plan.power),
            (self.level, plan.level),
            (self.frequency, plan.frequency),
            (self.verdict, plan.verdict),
            (self.trail, plan.trail),
            (self.residual, plan.residual),
            (self.spectrum, plan.spectrum),
            (self.panel, plan.panel),
        )
        for widget, box in placed:
            widget.setGeometry(*box)
        if self.sheet is not None:
            self.sheet.setGeometry(*plan.sheet)
        self.chain.set_compact(compact=plan.compact)
        for plot in (self.trail, self.residual, self.spectrum):
            plot.show_about = not plan.compact
            plot.refresh()
        self._place_foot(plan.foot, visible=not plan.compact)

    def _place_foot(self, foot: Box, *, visible: bool) -> None:
        self.foot.setVisible(visible)
        self.theme_button.setVisible(visible)
        width = self.theme_button.sizeHint().width()
        left = foot[0] + foot[2] - width
        self.theme_button.setGeometry(left, foot[1] - 2, width, max(24, foot[3] - 2))
        self.foot.setGeometry(foot[0], foot[1], max(10, left - foot[0] - 10), foot[3])
