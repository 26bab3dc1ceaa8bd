"""The guided calibration: a form before it, a picture of what to plug at each step, the record after it."""

from html import escape
from pathlib import Path

import attrs
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from wattproof.app import calibration_folder
from wattproof.core.calibration import Calibration
from wattproof.core.connection import Connection
from wattproof.core.errors import WattproofError
from wattproof.core.run import Ending
from wattproof.gui import task_text
from wattproof.gui.ask_card import AskCard
from wattproof.gui.ask_pictures import AskPicture
from wattproof.gui.driven import Driven
from wattproof.gui.form import Choices, Form, built
from wattproof.gui.panel import Page
from wattproof.gui.sheet import PaperSheet
from wattproof.gui.stations import Table
from wattproof.gui.theme import Theme
from wattproof.procedures.calibrate import METER, CalibratePlan
from wattproof.procedures.level_calibration import Meter
from wattproof.procedures.requests import Action, Ask, Wishes
from wattproof.report.calibration_document import calibration_lines
from wattproof.runner.calibrating import DONE, CalibrationRun, TableHand, make_calibration
from wattproof.runner.screen import Asked, Ended, Event, Progressed, ToneChanged
from wattproof.store.calibration_file import write_calibration
from wattproof.store.record_file import file_name


class CalibrationSheet(QWidget):
    """Large, where the plots are: what to plug, what is done now, and the record."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.picture = AskPicture(theme)
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setProperty("kind", "large")
        self.paper = PaperSheet(theme)
        rows = QVBoxLayout(self)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.addWidget(self.words)
        rows.addWidget(self.picture, 1)
        rows.addWidget(self.paper, 1)
        self.picture.hide()


class CalibrationDesk(Page):
    """One calibration after the other; it is a page, a run, and what a person answers."""

    def __init__(self, theme: Theme, runner: Driven, card: AskCard) -> None:
        super().__init__(theme)
        self.runner, self.card = runner, card
        self.sheet = CalibrationSheet(theme)
        self.run: CalibrationRun | None = None
        self.record: Calibration | None = None
        self.asked: Asked | None = None
        self._tone: ToneChanged | None = None
        self._ended = True
        self._table: TableHand | None = None
        self.with_meter = Choices(theme, task_text.WITH_METER, [(True, "yes"), (False, "no")])
        self.meter = Form(theme, Meter)
        self.plan = Form(theme, CalibratePlan)
        self.add_words(task_text.CALIBRATE_ABOUT)
        for widget in (self.with_meter, self.meter, self.plan):
            self.rows.addWidget(widget)
        self.rows.addStretch(1)
        self.with_meter.changed.connect(lambda: self.meter.setVisible(bool(self.with_meter.value)))
        card.answered.connect(self.answer)

    def opened(self) -> None:
        """Show what it begins with, unless a record is shown."""
        if self.record is None and not self.running:
            self._say(task_text.CALIBRATE_HEAD)
            self.sheet.picture.show_ask(Ask(Action.CONNECT, Connection.DIRECT.value))
            self.sheet.picture.show()

    @property
    def running(self) -> bool:
        """Whether a calibration is under way."""
        return not self._ended

    def start(self) -> None:
        """Start with the settings as they stand.

        Raises:
            WattproofError: a setting that doesn't fit, or a bench that can't.
        """
        plan = built(CalibratePlan, self.plan.values())
        meter = built(Meter, self.meter.values()) if self.with_meter.value else None
        rig, bench = self.runner.rig, self.runner.bench
        self.runner.stop()
        try:
            run = make_calibration(bench, plan, meter, rig, by_person=True)
            run.runner.start(run.calibrating.steps())
        except WattproofError:
            self.runner.begin()
            raise
        self.run, self._ended, self.record, self.asked = run, False, None, None
        self._table = TableHand(bench, meter) if bench.controls else None
        self._say(task_text.CALIBRATING)
        self.sheet.paper.show_text("")

    def stop(self) -> None:
        """Fall silent and end; nothing is stored."""
        if self.run is not None and self.running:
            self.run.runner.stop()

    def answer(self) -> None:
        """Answer what is asked: plugged, or what the meter shows."""
        asked, run = self.asked, self.run
        if asked is None or run is None:
            return
        typed = self.card.entry.typed
        done = typed if asked.ask.want == METER and typed else self._does(asked.ask)
        if done is None:
            return
        self.asked = None
        self.card.put_away()
        self.sheet.picture.hide()
        self._say(task_text.CALIBRATING)
        run.runner.answer(asked.ask_id, done)

    def _does(self, ask: Ask) -> float | str | None:
        done = None if self._table is None else self._table(ask)
        if done is None and ask.want != METER:
            return DONE
        return done

    def table(self, table: Table) -> Table:
        """Return what is on the table while a calibration sounds."""
        tone = self._tone
        if not self.running or tone is None:
            return table
        wishes = Wishes(tone.on, tone.frequency_hz, tone.level_fs if tone.on else 0.0, table.wishes.channel)
        return attrs.evolve(table, wishes=wishes)

    def tick(self) -> None:
        """Take in what came since the last frame."""
        if self.run is None or self._ended:
            return
        for event in self.run.runner.screen.drain():
            self._take(event)

    def _take(self, event: Event) -> None:
        match event:
            case Asked():
                self.asked = event
                self._ask(event.ask)
            case Progressed(progress=progress):
                self._say(task_text.doing(progress.doing))
            case ToneChanged():
                self._tone = event
            case Ended():
                self._end(event)
            case _:
                pass

    def _ask(self, ask: Ask) -> None:
        button = task_text.answer_button(ask, does_itself=self._table is not None)
        self.card.show_ask(ask, task_text.asked_below(ask, ""), button, typed=ask.want == METER)
        self.card.picture.hide()  # it is drawn large on the sheet
        self.sheet.picture.show_ask(ask)
        self.sheet.picture.show()
        self._say(task_text.asked(ask))

    def _end(self, event: Ended) -> None:
        self._ended, self.asked = True, None
        if self._table is not None:  # however it ended, the simulated table is wired again as it was
            self._table(Ask(Action.CONNECT, Connection.AMPLIFIER.value))
        self.card.put_away()
        self.sheet.picture.hide()
        run = self.run
        if event.ending is not Ending.DONE or run is None:
            self._say(event.why or task_text.NOTHING_STORED)
            return
        try:
            self.record = run.record()
            path = self._stored(self.record)
        except WattproofError as error:
            self._say(str(error))
            return
        self._say(task_text.CALIBRATED)
        lines = [*calibration_lines(self.record), "", task_text.STORED.format(path=path)]
        self.sheet.paper.show_text(
            f"<pre style='font-family: inherit; white-space: pre-wrap'>{escape(chr(10).join(lines))}</pre>"
        )

    @staticmethod
    def _stored(record: Calibration) -> Path:
        path = calibration_folder() / file_name(f"{record.device}-{record.rate_hz:g}")
        write_calibration(path, record)
        return path

    def _say(self, words: str) -> None:
        if self.sheet.words.text() != words:
            self.sheet.words.setText(words)
