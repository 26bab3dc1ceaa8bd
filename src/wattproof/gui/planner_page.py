"""The attenuator planner: a form made from what is declared, the circuit drawn, and everything that follows from it."""

from html import escape
from typing import Any

from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Rig
from wattproof.dsp.attenuator import Plan, plan
from wattproof.dsp.attenuator_wish import Wish
from wattproof.gui import task_text
from wattproof.gui.controls import FlatButton
from wattproof.gui.form import Form, built
from wattproof.gui.panel import Page
from wattproof.gui.sheet import PaperSheet
from wattproof.gui.theme import Theme
from wattproof.report.attenuator_svg import circuit_svg
from wattproof.report.attenuator_table import attenuator_table
from wattproof.report.attenuator_words import warnings

_NEEDED = ("power_w", "load_ohm", "full_scale_vrms", "input_ohm", "bridge_tied", "two_inputs", "series")
_WIDTH = 96
_SAID_OTHERWISE = ("Read this first", "Circuit")  # sections that the list and the drawing stand for
_DRAWN_IN = {"#14242e": "ink", "#fbfaf6": "ground", "#9c2f12": "warn"}  # the drawing's colours


class PlannerPage(Page):
    """Asks for power, load, full scale and input impedance; every change plans anew."""

    def __init__(self, theme: Theme, rig: Rig, full_scale_vrms: float | None) -> None:
        super().__init__(theme)
        self.sheet = PaperSheet(theme, _DRAWN_IN, fixed=False)
        wiring = rig.wirings[0]
        known: dict[str, object] = {
            "power_w": 50.0,
            "load_ohm": wiring.load.nominal_ohm,
            "full_scale_vrms": full_scale_vrms,
            "input_ohm": 20_000.0,
            "bridge_tied": wiring.bridge_tied,
        }
        self.form = Form(theme, Wish, only=_NEEDED, values=known)
        self.rest = Form(theme, Wish, without=_NEEDED)
        self.rest.hide()
        self.more = FlatButton(theme, task_text.MORE)
        self.more.clicked.connect(lambda _=False: self._show_rest(shown=self.rest.isHidden()))
        for widget in (self.form, self.more, self.rest):
            self.rows.addWidget(widget)
        self.add_words(task_text.PLANNER_ABOUT)
        self.rows.addStretch(1)
        for form in (self.form, self.rest):
            form.changed.connect(self.show_plan)

    def start(self) -> None:
        """Plan, and show circuit and page.

        Raises:
            WrongUseError: something typed does not fit, or there is no such attenuator.
        """
        values: dict[str, Any] = self.form.values() | self.rest.values()
        try:
            planned = plan(built(Wish, values))
        except ValueError as error:
            raise WrongUseError(str(error)) from error
        self.sheet.picture.show_svg(circuit_svg(planned))
        self.sheet.show_text(_words(planned))

    def show_plan(self) -> None:
        """Plan, or say in the plan's place why there is none."""
        try:
            self.start()
        except WrongUseError as error:
            self.sheet.picture.show_svg("")
            self.sheet.show_text(escape(str(error)))

    def _show_rest(self, *, shown: bool) -> None:
        self.rest.setVisible(shown)
        self.more.setText(task_text.FEWER if shown else task_text.MORE)
        self.more.setAccessibleName(self.more.text())


def _words(planned: Plan) -> str:
    """Return what is to be read first as a list, and the page's figures below; the drawing stands for the circuit."""
    listed = "".join(f"<li>{escape(each.text)}</li>" for each in warnings(planned))
    sections = attenuator_table(planned, width=_WIDTH).split("\n\n")
    figures = [each for each in sections[1:] if not each.startswith(_SAID_OTHERWISE)]
    page = escape("\n\n".join(figures))
    return f"<h3>{task_text.READ_FIRST}</h3><ul>{listed}</ul><pre>{page}</pre>"
