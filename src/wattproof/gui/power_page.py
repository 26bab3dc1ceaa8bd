"""The column's two pages of a power statement: what is asked before it, and the statement while it is built."""

from collections.abc import Sequence
from typing import Any

import attrs
from PySide6.QtCore import Signal
from PySide6.QtWidgets import QGridLayout, QLabel, QWidget

from wattproof.bench.protocol import Control
from wattproof.core.rig import Rig
from wattproof.gui import statement_view, task_text, text
from wattproof.gui.controls import FlatButton
from wattproof.gui.form import Choices, Entry, Form, built, number
from wattproof.gui.guided import Guided
from wattproof.gui.panel import Page
from wattproof.gui.statement_table import StatementTable
from wattproof.gui.stations import is_load
from wattproof.gui.theme import Theme
from wattproof.gui.trail import OPEN_OHM
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan
from wattproof.procedures.presets import preset_plan

_HOLDS_S = (10.0, 60.0, 300.0, 0.0)
_ON_TOP = ("loads", "channels", "supply_v", "claimed_w", "hold_s")  # what everybody sees; the rest is one click away
_SHARED = tuple(field.name for field in attrs.fields(PowerPlan))


class SetupPage(Page):
    """What a person says before a statement: how, loads, channels, supply, claim; everything else on demand."""

    first_power_up = Signal()
    changed = Signal()

    def __init__(self, theme: Theme, rig: Rig, controls: Sequence[Control], *, plays: bool = True) -> None:
        super().__init__(theme)
        hows: list[tuple[object, str]] = [(HandPlan, task_text.BY_HAND), (StepsPlan, task_text.BY_STEPS)]
        self.how = Choices(theme, task_text.HOW, hows, task_text.HOW_HELP)
        self.about = QLabel(task_text.BY_HAND_ABOUT)
        self.about.setWordWrap(True)
        self.about.setProperty("kind", "remark")
        self.loads = Choices(theme, task_text.LOADS, _load_choices(rig, controls))
        self.channels = Choices(theme, task_text.CHANNELS, _channel_choices(rig))
        self.hold = Choices(theme, task_text.HOLD, [(each, _hold_words(each)) for each in _HOLDS_S])
        self.supply = Entry(task_text.SUPPLY, words=False, empty=task_text.NOT_STATED)
        self.claimed = Entry(task_text.CLAIMED, words=False, empty=task_text.NOT_STATED)
        self.more = FlatButton(theme, task_text.MORE)
        self.rest = {kind: Form(theme, kind, without=_ON_TOP) for kind in (HandPlan, StepsPlan)}
        power_up = FlatButton(theme, task_text.FIRST_POWER_UP)
        power_up.clicked.connect(lambda _=False: self.first_power_up.emit())
        for widget in (self.how, self.about, self.loads, self.channels):
            self.rows.addWidget(widget)
        self.rows.addWidget(_typed((task_text.SUPPLY, self.supply, "V"), (task_text.CLAIMED, self.claimed, "W")))
        self.rows.addWidget(self.hold)
        self.rows.addWidget(self.more)
        for form in self.rest.values():
            form.hide()
            self.rows.addWidget(form)
        self.rows.addWidget(power_up)
        self.add_cautions(text.CAUTION_MAINS, text.CAUTION_HOT)
        self.loads.setVisible(len(self.loads.buttons) > 1)
        self.channels.setVisible(len(self.channels.buttons) > 1)
        self.more.clicked.connect(lambda _=False: self._show_rest(shown=self.more.text() == task_text.MORE))
        self.how.changed.connect(self._how_changed)

    def plan(self) -> PowerPlan:
        """Return the plan as it was set.

        Raises:
            WrongUseError: something typed is no number, is outside its range, or doesn't fit.
        """
        kind = self.how.value
        values: dict[str, Any] = self.rest[kind].values()
        values |= {"loads": self.loads.value, "channels": self.channels.value, "hold_s": self.hold.value}
        values |= {
            "supply_v": _given(task_text.SUPPLY, self.supply),
            "claimed_w": _given(task_text.CLAIMED, self.claimed),
        }
        return preset_plan(built(kind, values))

    def _how_changed(self) -> None:
        by_hand = self.how.value is HandPlan
        self.about.setText(task_text.BY_HAND_ABOUT if by_hand else task_text.BY_STEPS_ABOUT)
        before = self.rest[StepsPlan if by_hand else HandPlan]
        shared = {name: value for name, value in _texts(before).items() if name in _SHARED}
        _show_texts(self.rest[self.how.value], shared)
        self._show_rest(shown=self.more.text() == task_text.FEWER)

    def _show_rest(self, *, shown: bool) -> None:
        self.more.setText(task_text.FEWER if shown else task_text.MORE)
        self.more.setAccessibleName(self.more.text())
        for kind, form in self.rest.items():
            form.setVisible(shown and kind is self.how.value)


class StatementPage(Page):
    """The statement as it is built: the table, what happens now, and at the end what it says in plain language."""

    def __init__(self, theme: Theme) -> None:
        super().__init__(theme)
        self.table = StatementTable(theme)
        self.doing = _label("hint")
        self.left = _label("remark")
        self.words = _label("result")
        self.remarks = _label("remark")
        for widget in (self.table, self.doing, self.left, self.words, self.remarks):
            self.rows.addWidget(widget)
        self.rows.addStretch(1)

    def show_run(self, run: Guided) -> None:
        """Show how far a run is."""
        self.table.show_rows(statement_view.rows_of(run))
        progress = run.progress
        running = run.running and progress is not None and run.sounding and not run.hands_off
        _say(self.doing, task_text.doing(progress.doing) if running and progress is not None else "")
        _say(self.left, _left_words(run) if run.running and run.prompt is None else "")
        _say(self.words, statement_view.spoken_of(run) if not run.running else "")
        remarks = "" if run.running else "\n".join(_bulleted(run))
        _say(self.remarks, remarks)


def _left_words(run: Guided) -> str:
    progress = run.progress
    if progress is None:
        return ""
    heat = "" if progress.heat_left_s is None else task_text.HEAT_LEFT.format(seconds=progress.heat_left_s)
    left = task_text.time_left(progress.left_s) if run.sounding else ""
    refused = task_text.REFUSED.format(count=run.refused) if run.refused else ""
    return " · ".join(part for part in (left, heat, refused) if part)


def _bulleted(run: Guided) -> list[str]:
    found = [f"• {words}" for words in statement_view.remarks_of(run)]
    conditions = statement_view.conditions_of(run)
    if conditions:
        found += ["", task_text.CONDITIONS, *conditions]
    return found


def _say(label: QLabel, words: str) -> None:
    if label.text() != words:
        label.setText(words)
    if label.isHidden() == bool(words):
        label.setVisible(bool(words))


def _label(kind: str) -> QLabel:
    label = QLabel()
    label.setWordWrap(True)
    label.setProperty("kind", kind)
    label.hide()
    return label


def _typed(*rows: tuple[str, Entry, str]) -> QWidget:
    block = QWidget()
    grid = QGridLayout(block)
    grid.setContentsMargins(0, 0, 0, 0)
    grid.setColumnStretch(0, 1)
    for index, (words, entry, unit) in enumerate(rows):
        name = QLabel(words)
        name.setBuddy(entry)
        grid.addWidget(name, index, 0)
        grid.addWidget(entry, index, 1)
        grid.addWidget(QLabel(unit), index, 2)
    return block


def _given(label: str, entry: Entry) -> float | None:
    return float(number(label, entry.typed)) if entry.typed else None


def _load_choices(rig: Rig, controls: Sequence[Control]) -> list[tuple[object, str]]:
    switch = next((control for control in controls if is_load(control) and control.choices), None)
    loads = [choice for choice in switch.choices if choice < OPEN_OHM] if switch is not None else []
    if not loads:
        return [("", f"{rig.wirings[0].load.nominal_ohm:g} Ω")]
    loads.sort(reverse=True)
    single: list[tuple[object, str]] = [(f"{each:g}", f"{each:g} Ω") for each in loads]
    return [*single, (",".join(f"{each:g}" for each in loads), task_text.BOTH)] if len(loads) == 2 else single


def _channel_choices(rig: Rig) -> list[tuple[object, str]]:
    names: list[tuple[object, str]] = [
        (str(number), wiring.name or str(number)) for number, wiring in enumerate(rig.wirings, start=1)
    ]
    return [*names, (",".join(str(value) for value, _ in names), task_text.BOTH)] if len(names) == 2 else names


def _hold_words(seconds: float) -> str:
    if seconds == 0.0:
        return task_text.MOMENTARY_ONLY
    return f"{seconds:g} s" if seconds < 100.0 else f"{seconds / 60.0:g} min"


def _texts(form: Form) -> dict[str, object]:
    return {name: each.value if isinstance(each, Choices) else each.text() for name, each in form.widgets.items()}


def _show_texts(form: Form, values: dict[str, object]) -> None:
    for name, value in values.items():
        widget = form.widgets.get(name)
        if isinstance(widget, Choices):
            widget.choose(value)
        elif widget is not None:
            widget.setText(str(value))
