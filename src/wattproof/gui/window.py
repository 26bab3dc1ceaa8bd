"""The window: it polls a runner thirty times a second, shows what it says, and hands on what a person wants."""

from collections.abc import Callable
from functools import partial

import attrs
from PySide6.QtCore import Qt, QTimer, Signal
from PySide6.QtGui import QCloseEvent, QKeyEvent, QKeySequence, QShortcut
from PySide6.QtWidgets import QApplication, QMainWindow

from wattproof.app import list_devices, make_measurement, open_watch
from wattproof.bench.protocol import Bench
from wattproof.core.errors import WattproofError
from wattproof.core.reading import Reading, State
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.gui import task_text, text
from wattproof.gui.driven import Driven
from wattproof.gui.face import Face
from wattproof.gui.floor import FloorKey, floor_of
from wattproof.gui.hand import COARSE, FINE, Hand
from wattproof.gui.hints import hint_for
from wattproof.gui.icon import window_icon
from wattproof.gui.pages import build_pages
from wattproof.gui.panel import Hands
from wattproof.gui.power_desk import Measure, PowerDesk
from wattproof.gui.power_page import SetupPage, StatementPage
from wattproof.gui.readout import STALE, WAITING, Readout, load_words, readout_of, withheld_readout
from wattproof.gui.reopening import Reopening
from wattproof.gui.sentence import Mark, Sentence
from wattproof.gui.sheets import add_sheets
from wattproof.gui.statement_view import Cell
from wattproof.gui.stations import Place, Table, stations_of
from wattproof.gui.style import sheet
from wattproof.gui.task_board import TaskBoard
from wattproof.gui.task_list import TaskList
from wattproof.gui.tasks import Task, tasks_for
from wattproof.gui.theme import Choice, Theme
from wattproof.gui.trail import Axis, Trail, point_of
from wattproof.procedures.power_plan import PowerPlan
from wattproof.procedures.requests import Shown
from wattproof.runner.measuring import Measurement
from wattproof.runner.screen import Asked, Ended, Event, ReadingsTaken, Refused, ToneChanged

_TICK_MS = 33  # thirty frames a second
_DIGITS_EVERY = 6  # ticks: digits that change faster than five times a second can't be read
_WORDS_EVERY = 18  # ticks: a sentence needs longer to be read; a multiple of the digits' ticks
_SETTINGS_EVERY = 10
_OVERLOAD_STAYS = 30  # ticks after the last overloaded block, so that it can't be missed
_STALE_AFTER = 60  # ticks without a reading
_STALE_MEASURING = 150  # likewise while a statement is measured, whose readings are up to a second long
_AXIS_WORDS = {
    Axis.POWER: text.TRAIL_BY_POWER,
    Axis.VOLTS: text.TRAIL_BY_VOLTS,
    Axis.FULL_SCALE: text.TRAIL_BY_FULL_SCALE,
}


class Window(QMainWindow):
    """The face of the program. It takes its runner in the constructor, so it can be driven without a person."""

    replaced = Signal(object)  # the runner of another bench, which a new window is to show

    def __init__(
        self, runner: Driven, theme: Theme | None = None, measure: Measure | None = None, trail: Trail | None = None
    ) -> None:
        super().__init__()
        self.runner = runner
        self.theme = theme or Theme()
        self.hand = Hand(runner.bench)
        self.trail = trail or Trail()
        self._reopening = Reopening(runner, open_watch)
        self.refused = 0
        self._floor_key: FloorKey | None = None
        self.reading: Reading | None = None
        self.ended: Sentence | None = None
        self._ticks = 0
        self._last_reading = 0
        self._overloaded_until = -1
        self._shown_state: State | None = None
        self.setWindowTitle(text.TITLE)
        self.setWindowIcon(window_icon())
        self.setMinimumSize(1024, 640)
        self.face = Face(self.theme, self.trail, self)
        self.setCentralWidget(self.face)
        self.board = self._task_board(measure or _measure)
        self.desk = self.board.desk
        self.pages = self.board.pages = build_pages(self.face.panel, runner, self._hands(), Table.of(runner, None))
        self._connect()
        self._bind_keys()
        self.restyle()
        start = Place.AMPLIFIER if runner.bench.controls else Place.TONE
        self.board.open_station(start if self.table().plays else Place.CAPTURE)
        self.show_digits(words_too=True)
        self.face.setFocus()
        self.timer = QTimer(self)
        self.timer.setInterval(_TICK_MS)
        self.timer.timeout.connect(self.tick)
        self.timer.start()

    def _task_board(self, measure: Measure) -> TaskBoard:
        runner, theme, face = self.runner, self.theme, self.face
        setup = SetupPage(theme, runner.rig, runner.bench.controls)
        desk = PowerDesk(runner, measure, self.hand, setup, StatementPage(theme), face.panel.card)
        tasks = TaskList(theme, tasks_for(plays=runner.bench.identity.outputs > 0))
        board = TaskBoard(face, runner, tasks, self.trail, desk)
        add_sheets(board, theme, list_devices, self.open_bench)
        board.reconnect.connect(lambda: self.open_bench(runner.bench.identity.name))
        return board

    def _hands(self) -> Hands:
        runner = self.runner
        return Hands(
            lambda hertz: self.board.attempt(runner.wish, frequency_hz=hertz),
            lambda level: self.board.attempt(runner.wish, level_fs=level),
            lambda channel: self.board.attempt(runner.wish, channel=channel),
            lambda volts: self.board.attempt(runner.set_drive_limit_vrms, volts),
            lambda ratio: self.board.attempt(runner.set_drive_limit_fs, ratio),
            self.turn,
            self.trail.begin,
        )

    def _connect(self) -> None:
        face = self.face
        face.panel.tone_toggled.connect(self.board.press)
        face.chain.opened.connect(self.board.open_station)
        face.chain.turned.connect(self._wheel)
        self.desk.page.table.opened.connect(self._open_cell)
        self.board.changed.connect(lambda: self.show_digits(words_too=True))
        face.theme_button.clicked.connect(lambda _=False: self.next_theme())
        self.theme.changed.connect(self.restyle)

    def _bind_keys(self) -> None:
        space = self._key(Qt.Key.Key_Space, self.board.press)
        space.setAutoRepeat(False)
        self._key(Qt.Key.Key_Escape, self._escape)
        self._key(Qt.Key.Key_N, self.trail.begin)
        self._key(Qt.Key.Key_M, self.board.toggle_list)
        self._key(Qt.Key.Key_T, self.next_theme)
        self._key(Qt.Key.Key_B, self.face.next_budget)
        self._key(QKeySequence.StandardKey.Quit, self.close)
        for number, place in enumerate(Place, start=1):
            self._key(str(number), partial(self.board.open_station, place))

    def _key(self, keys: Qt.Key | QKeySequence.StandardKey | str, action: Callable[[], object]) -> QShortcut:
        shortcut = QShortcut(QKeySequence(keys), self)
        shortcut.activated.connect(action)
        return shortcut

    # --- what a person does

    def open_bench(self, named: str) -> None:
        """Let go of the bench and open another one, or the same one again; this window goes on showing what it says."""
        if self._reopening.under_way:
            return
        self.board.stop()
        self.desk.close()
        self._reopening.begin(named)
        self.ended = Sentence(task_text.OPENING.format(name=named), "", Mark.WITHHELD)
        self._forget()

    def _follow_opening(self) -> None:
        """See whether the other bench is open by now."""
        try:
            runner = self._reopening.take()
        except WattproofError as error:
            self.board.lost = True
            self.ended = Sentence(text.FAILED, str(error), Mark.WARNING)
            self.face.panel.say(str(error))
            return
        if runner is not None:
            self.replaced.emit(runner)

    def _escape(self) -> None:
        """Silence what sounds, and put a budget away."""
        self.face.budget.put_away()
        self.board.silence()

    def _open_cell(self, cell: Cell) -> None:
        if cell.quantity is not None:
            label = task_text.POINT_POWER.format(at=cell.at)
            self.face.budget.open_for(self.desk.page.table, label, cell.quantity)

    def _shade_floor(self) -> None:
        """Shade the interface's own floor for what is wired and driven now."""
        table, plot = self.table(), self.face.trail
        drive_fs = table.wishes.level_fs if table.wishes.tone_on and not self.board.measuring else None
        key = FloorKey(table.wiring, table.wiring.load.ohm, plot.along, plot.across, drive_fs or None)
        if key != self._floor_key:
            self._floor_key = key
            plot.show_floor(floor_of(table.calibration, key))

    def turn(self, name: str, value: float) -> None:
        """Set one of the bench's own controls; anything but the knob begins a new stroke."""
        self.board.attempt(self.hand.turn, name, value)
        knob = self.hand.knob
        if knob is None or name != knob.name:
            self.trail.begin()

    def turn_knob(self, steps: float) -> None:
        """Turn the bench's knob by steps of a hundredth of its range."""
        self.board.attempt(self.hand.nudge, steps)
        self.face.panel.show_controls(self.runner.bench.controls)

    def next_theme(self) -> None:
        """Go on to the next of system, light and dark."""
        order = list(Choice)
        self.theme.choose(order[(order.index(self.theme.choice) + 1) % len(order)])

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Turn the knob by the arrow keys that nothing else has taken."""
        steps = {
            Qt.Key.Key_Up: 1.0,
            Qt.Key.Key_Down: -1.0,
            Qt.Key.Key_PageUp: COARSE / FINE,
            Qt.Key.Key_PageDown: -COARSE / FINE,
        }.get(Qt.Key(event.key()))
        if steps is None:
            super().keyPressEvent(event)
        else:
            self.turn_knob(steps)

    def _wheel(self, place: str, steps: float) -> None:
        if place == Place.AMPLIFIER.value:
            self.turn_knob(steps)

    # --- what the runner says

    def table(self) -> Table:
        """Return what is on the table right now."""
        table = Table.of(self.runner, self.reading)
        if self.board.measuring:
            return self.desk.table(table)
        for run in self.board.runs:
            table = run.table(table)
        return table

    def tick(self) -> None:
        """Take in what came since the last frame and show it."""
        self._ticks += 1
        self._follow_opening()
        self.hand.follow()
        screen = self.runner.screen
        if self.board.measuring and self.desk.run is not None:
            screen.drain()  # the watch has ended, as it should
            screen = self.desk.run.measurement.runner.screen
            self.desk.tick(self._take_measured)
        else:
            for event in screen.drain():
                self._take(event)
            for run in self.board.runs:
                run.tick()
        shown = screen.newest()
        if shown is not None:
            self._take_picture(shown)
        stale_after = _STALE_MEASURING if self.board.measuring else _STALE_AFTER
        if self.reading is not None and self._ticks - self._last_reading > stale_after:
            self._forget()
        self.face.trail.follow()
        state = None if self.reading is None else self.reading.state
        if state is not self._shown_state or self._ticks % _DIGITS_EVERY == 0:
            self.show_digits(words_too=state is not self._shown_state or self._ticks % _WORDS_EVERY == 0)
            self._shown_state = state
        if self._ticks % _SETTINGS_EVERY == 0:
            self.pages.refresh(self.table())
            self._shade_floor()

    def _take_measured(self, event: Event) -> None:
        """Take in an event of a power statement."""
        match event:
            case ReadingsTaken():
                channel = self.table().wishes.channel
                reading = next((each for each in event.readings if each.channel == channel), None)
                if reading is not None and self.desk.sounding:
                    self.reading, self._last_reading = reading, self._ticks
                    found = point_of(reading)
                    self.desk.trail.now = None if found is None else found[1:]
            case ToneChanged(on=False) | Ended():
                self._forget()
                self.desk.trail.now = None
                self.show_digits(words_too=True)
            case Refused():
                self.desk.trail.lift()
            case _:
                pass

    def _take(self, event: Event) -> None:
        match event:
            case ReadingsTaken():
                self._take_readings(event.readings)
            case ToneChanged():
                if event.why:
                    self.face.panel.say(text.tone_changed(event.why))
            case Ended():
                failed = event.ending is Ending.FAILED
                title, mark = (text.FAILED, Mark.WARNING) if failed else (text.ENDED, Mark.WITHHELD)
                self.board.lost = failed
                self.ended = Sentence(title, event.why, mark)
                self._forget()
            case Asked():
                self.face.panel.say(text.asked(event.ask.action.value, event.ask.want))
            case Refused():
                self.refused += 1
                self.trail.lift()  # nothing is known of the way to the next reading

    def _take_readings(self, readings: tuple[Reading, ...]) -> None:
        wishes = self.runner.wishes
        looked_at = next((reading for reading in readings if reading.channel == wishes.channel), None)
        if looked_at is None:
            return
        self.trail.take(looked_at, wishes.frequency_hz)
        self._last_reading = self._ticks
        self.ended, self.board.lost = None, False  # a new run has begun
        if looked_at.state is State.OVERLOAD:
            self._overloaded_until = self._ticks + _OVERLOAD_STAYS
        if looked_at.state is State.OVERLOAD or self._ticks >= self._overloaded_until:
            self.reading = looked_at

    def _take_picture(self, shown: Shown) -> None:
        state = None if self.reading is None else self.reading.state
        residual = shown.picture if state is State.OK else None
        spectrum = shown.picture if state in (State.OK, State.NO_TONE) else None
        self.face.show_picture(residual, spectrum)

    def _forget(self) -> None:
        self.reading = None
        self.trail.now = None
        self.face.show_picture(None, None)

    # --- what is shown

    def show_digits(self, *, words_too: bool) -> None:
        """Show the newest reading in figures, and in words where it is time for them."""
        face, table = self.face, self.table()
        tone_on = table.wishes.tone_on if table.plays else None
        face.show_readout(self._readout(tone_on), sentence_too=words_too)
        self.desk.show()
        face.chain.show_stations(stations_of(table), bridge_tied=table.wiring.bridge_tied)
        face.panel.set_tone(on=bool(tone_on) or self.board.busy, words=self.board.button_words())
        face.panel.tone.setVisible(self.board.has_button)
        if words_too:
            watching = self.board.task is Task.WATCH
            face.panel.set_hint(hint_for(self.reading, tone_on=tone_on) if watching else "")
        face.foot.setText(self._foot_words())
        load = load_words(self.reading) if self.reading is not None else ""
        channel = table.wiring.name if table.plays else text.channel(table.wishes.channel)
        face.trail.set_about(text.trail_about(_AXIS_WORDS[face.trail.along], load, channel, self._before_words()))

    def _readout(self, tone_on: bool | None) -> Readout:  # noqa: FBT001 - as hints and sentences take it
        silent = self.desk.silent_readout() if self.board.measuring else None
        if silent is not None:
            return silent
        if self.ended is not None:
            return withheld_readout(self.ended)
        if self.reading is None:
            return withheld_readout(STALE if self._ticks > _STALE_AFTER else WAITING)
        readout = readout_of(self.reading, tone_on=tone_on)
        if readout.sentence.detail == text.NO_TONE_OFF_DETAIL and self.board.task is not Task.WATCH:
            return attrs.evolve(readout, sentence=attrs.evolve(readout.sentence, detail=""))
        return readout

    def _before_words(self) -> str:
        earlier = self.trail.earlier
        if earlier is None or earlier.key.axis is not self.face.trail.along:
            return ""
        return text.earlier(earlier.key.load_ohm, earlier.key.frequency_hz)

    def _foot_words(self) -> str:
        identity = self.runner.bench.identity
        keys = text.KEYS if self.runner.bench.controls else text.KEYS_REAL
        keys = keys if identity.outputs else text.KEYS_RECORDED
        run = self.desk.run if self.board.measuring else None
        kept = self.runner.kept() or None if run is None else run.measurement.runner.kept()
        refused = self.refused if run is None else run.refused
        return f"{text.footer(identity.name, identity.rate_hz, kept, refused)}      {keys}"

    def restyle(self) -> None:
        """Put the palette and the scale in force on what Qt paints itself."""
        QApplication.setPalette(self.theme.qt_palette())
        self.setStyleSheet(sheet(self.theme))
        self.face.panel.respace()
        self.face.set_theme_words(text.THEMES[self.theme.choice.value])

    def closeEvent(self, event: QCloseEvent) -> None:
        """Fall silent before the window goes."""
        self.timer.stop()
        self.board.stop()
        self.desk.close()
        self.runner.stop()
        super().closeEvent(event)


def _measure(bench: Bench, plan: PowerPlan, rig: Rig) -> Measurement:
    """A person turns and switches; nothing is done by itself."""
    return make_measurement(bench, plan, rig, hand_db_per_s=None)
