"""Which task is open: its page in the column, its sheet beside it, and what the one big button does for it."""

from collections.abc import Callable
from typing import Any, Protocol

import attrs
from PySide6.QtCore import QObject, Signal
from PySide6.QtWidgets import QWidget

from wattproof.core.errors import WattproofError
from wattproof.gui import task_text
from wattproof.gui.driven import Driven
from wattproof.gui.face import Face
from wattproof.gui.pages import Pages
from wattproof.gui.panel import Page
from wattproof.gui.power_desk import PowerDesk
from wattproof.gui.stations import Place, Table, stations_of
from wattproof.gui.task_list import TaskList
from wattproof.gui.tasks import Task
from wattproof.gui.trail import Trail

LIST, SETUP, STATEMENT = "list", "setup", "statement"  # pages that are no station's and no other task's


class Run(Protocol):
    """A measurement that goes on by itself until it is stopped."""

    @property
    def running(self) -> bool:
        """Whether it is under way."""
        ...

    def stop(self) -> None:
        """Fall silent and end."""
        ...

    def tick(self) -> None:
        """Take in what came since the last frame."""
        ...

    def table(self, table: Table) -> Table:
        """Return what is on the table while it sounds."""
        ...


@attrs.frozen
class Sheet:
    """A task's own place: its page in the column and, where it has one, what stands where the plots are."""

    heading: str = ""
    sheet: QWidget | None = None
    words: str = ""  # on the big button, "" where the task has nothing to start
    press: Callable[[], None] | None = None
    opened: Callable[[], None] | None = None


class TaskBoard(QObject):
    """Opens tasks, stations and the list of tasks; refuses while a measurement runs."""

    changed = Signal()
    reconnect = Signal()

    def __init__(self, face: Face, runner: Driven, tasks: TaskList, trail: Trail, desk: PowerDesk) -> None:
        super().__init__()
        self.face, self.runner, self.list, self.trail, self.desk = face, runner, tasks, trail, desk
        self.task = Task.WATCH
        self.station = Place.AMPLIFIER
        self.page = ""
        self.lost = False  # the bench is gone: the big button reconnects
        self.pages: Pages | None = None
        self.runs: list[Run] = []  # besides the power statement's
        self._sheets: dict[Task, Sheet] = {}
        panel = face.panel
        for name, page in ((LIST, tasks), (SETUP, desk.setup), (STATEMENT, desk.page)):
            panel.add_page(name, page)
        panel.head.clicked.connect(lambda _=False: self.toggle_list())
        tasks.chosen.connect(self.open_task)
        desk.setup.first_power_up.connect(lambda: self.open_task(Task.FIRST_POWER_UP.value))
        desk.changed.connect(self.show_task)

    def add(self, task: Task, page: Page, sheet: Sheet) -> None:
        """Give a task its page and its sheet."""
        self.face.panel.add_page(task.value, page)
        self._sheets[task] = sheet

    @property
    def busy(self) -> bool:
        """Whether a measurement runs that has to be stopped first."""
        return self.desk.running or any(run.running for run in self.runs)

    def stop(self) -> None:
        """End whatever is measured."""
        self.desk.stop()
        for run in self.runs:
            run.stop()

    @property
    def measuring(self) -> bool:
        """Whether a power statement, running or done, is what the window shows."""
        return self.task is Task.POWER and self.desk.run is not None

    # --- what a person does

    def press(self) -> None:
        """Do what the big button does: start or stop the tone, or the measurement."""
        sheet = self._sheets.get(self.task)
        if not self.has_button:
            return
        if self.busy:
            self.stop()
        elif self.task is Task.POWER:
            self._press_power()
        elif self.task is Task.WATCH and self.lost:
            self.reconnect.emit()
        elif sheet is None or self.runner.wishes.tone_on:
            self.attempt(self.runner.wish, tone_on=not self.runner.wishes.tone_on)
        elif sheet.press is not None:
            self.attempt(sheet.press)
        self.changed.emit()

    def _press_power(self) -> None:
        if self.page == SETUP:
            self.attempt(self.desk.start)
        else:
            self._show_page(SETUP)

    def silence(self) -> None:
        """Stop whatever sounds."""
        if self.busy:
            self.stop()
        elif self.runner.wishes.tone_on:
            self.attempt(self.runner.wish, tone_on=False)
        self.changed.emit()

    def toggle_list(self) -> None:
        """Open the list of what can be done, or close it."""
        if self.busy:
            self.face.panel.say(task_text.BUSY)
        elif self.page == LIST:
            self.show_task()
        else:
            self.list.show_task(self.task)
            self._show_page(LIST)
            self.list.buttons[self.task].setFocus()

    def open_station(self, name: str) -> None:
        """Open a station's settings, by its place in the chain; it belongs to the watch."""
        if not self.busy:
            self.station = Place(name)
        self.open_task(Task.WATCH.value)

    def open_task(self, name: str) -> None:
        """Begin with another task; the tone of the watch is silenced on the way to it."""
        if self.busy:
            self.face.panel.say(task_text.BUSY)
            return
        before, self.task = self.task, Task(name)
        if before is Task.WATCH and self.task is not Task.WATCH and self.runner.wishes.tone_on:
            self.attempt(self.runner.wish, tone_on=False)
        if not (self.measuring or self.lost or self.runner.running):
            self.runner.screen.drain()
            self.attempt(self.runner.begin)
        self.show_task()
        sheet = self._sheets.get(self.task)
        if sheet is not None and sheet.opened is not None:
            self.attempt(sheet.opened)
        self.face.setFocus()
        self.changed.emit()

    # --- what is shown

    def show_task(self) -> None:
        """Show the page of the task in force."""
        measured = self.desk.run is not None
        pages = {Task.WATCH: self.station.value, Task.POWER: STATEMENT if measured else SETUP}
        self._show_page(pages.get(self.task, self.task.value))
        sheet = self._sheets.get(self.task)
        self.face.show_sheet(None if sheet is None else sheet.sheet)
        self.face.trail.show_trail(self.desk.trail if self.measuring else self.trail)
        self.face.chain.choose(self.station if self.task is Task.WATCH else None)

    def _show_page(self, name: str) -> None:
        self.page = name
        heading = stations_of(Table.of(self.runner, None))[self.station].label if name == self.station.value else ""
        if name == self.task.value and self.task in self._sheets:
            heading = self._sheets[self.task].heading
        panel, listed = self.face.panel, name == LIST
        panel.show_page(name, heading)
        panel.set_head(task_text.CHOOSE if listed else task_text.NAMES[self.task], listed=listed)
        panel.say("")

    def button_words(self) -> str:
        """Return the big button's words, "" where it starts and stops the tone."""
        if self.busy:
            return task_text.STOP
        if self.task is Task.POWER:
            return task_text.START if self.page == SETUP else task_text.AGAIN
        if self.task is Task.WATCH and self.lost:
            return task_text.RECONNECT
        sheet = self._sheets.get(self.task)
        return "" if sheet is None or self.runner.wishes.tone_on else sheet.words

    @property
    def has_button(self) -> bool:
        """Whether the big button does anything for this task."""
        sheet = self._sheets.get(self.task)
        plays = self.runner.bench.identity.outputs > 0
        if sheet is None:
            return plays or self.lost
        return bool(sheet.words) or self.runner.wishes.tone_on

    def attempt(self, action: Callable[..., None], *args: Any, **wanted: Any) -> None:  # noqa: ANN401 - handed on as they are
        """Do what a person wants, or show the one line that says why not."""
        try:
            action(*args, **wanted)
        except WattproofError as refusal:
            self.face.panel.say(str(refusal))
            if self.pages is not None:  # the controls go back to what is in force
                self.pages.refresh(Table.of(self.runner, None))
        else:
            self.face.panel.say("")
