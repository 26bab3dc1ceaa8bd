"""Runs the guided power statement: starts it, passes on what a person answers, and shows what it tells."""

from collections.abc import Callable

import attrs
from PySide6.QtCore import QObject, Signal

from wattproof.bench.protocol import Bench
from wattproof.core.errors import WattproofError
from wattproof.core.notes import Kind
from wattproof.core.rig import Rig
from wattproof.gui import figures, strokes, task_text
from wattproof.gui.ask_card import AskCard
from wattproof.gui.driven import Driven
from wattproof.gui.guided import Guided
from wattproof.gui.hand import Hand
from wattproof.gui.power_page import SetupPage, StatementPage
from wattproof.gui.readout import Readout, withheld_readout
from wattproof.gui.sentence import Mark, Sentence
from wattproof.gui.statement_view import marks_of, result_readout
from wattproof.gui.stations import Table
from wattproof.gui.trail import Trail
from wattproof.procedures.driving import HERE
from wattproof.procedures.power_plan import PowerPlan
from wattproof.procedures.power_switching import LEAVE, YES
from wattproof.procedures.requests import Action, Ask, Wishes
from wattproof.runner.hands import HERE_AND_DONE, BenchHand
from wattproof.runner.measuring import Measurement
from wattproof.runner.screen import Event

Measure = Callable[[Bench, PowerPlan, Rig], Measurement]
NOT_YET = "not yet"


class PowerDesk(QObject):
    """One power statement after the other. `changed` says that the column shows the other page now."""

    changed = Signal()

    def __init__(  # noqa: PLR0913, PLR0917 - the parts of the window that a statement works with
        self, runner: Driven, measure: Measure, hand: Hand, setup: SetupPage, page: StatementPage, card: AskCard
    ) -> None:
        super().__init__()
        self.runner, self.measure, self.hand, self.trail = runner, measure, hand, Trail()
        self.setup, self.page, self.card = setup, page, card
        self.run: Guided | None = None
        self._helper = BenchHand(runner.bench) if runner.bench.controls else None
        card.give_knob(hand.knob)
        card.answered.connect(self.answer)
        card.declined.connect(self.decline)
        card.turned.connect(self._turn)

    @property
    def running(self) -> bool:
        """Whether a statement is being measured."""
        return self.run is not None and self.run.running

    @property
    def sounding(self) -> bool:
        """Whether its tone is on."""
        return self.run is not None and self.run.running and self.run.sounding

    # --- what a person does

    def start(self) -> None:
        """Start with the settings as they stand.

        Raises:
            WattproofError: a setting that doesn't fit, or a bench that can't; the watch goes on then.
        """
        plan = self.setup.plan()
        rig = self.runner.rig
        self.runner.stop()
        try:
            measurement = self.measure(self.runner.bench, plan, rig)
            measurement.start()
        except WattproofError:
            self.runner.begin()
            raise
        if self.run is not None:
            self.run.close()
        self.run = Guided(measurement)
        self.trail.clear()
        self.trail.claimed_w = plan.claimed_w
        self.changed.emit()

    def stop(self) -> None:
        """Fall silent and end; what was kept is still stated."""
        if self.run is not None and self.run.running:
            self.run.measurement.runner.stop()

    def close(self) -> None:
        """Stop, and let go of what a run keeps."""
        self.stop()
        if self.run is not None:
            self.run.close()

    def answer(self) -> None:
        """Answer what is asked by the main button: done, yes, or "I am here"."""
        run = self.run
        if run is None:
            return
        if run.here_due:
            run.measurement.runner.here()
            run.said_here()
        elif run.ask is not None:
            self._give(self._does(run.ask.ask))
        elif run.prompt is not None and self._helper is not None:
            self.hand.let_go()
            self._helper(run.prompt)

    def decline(self) -> None:
        """Answer that it is not so: nothing sounds, and the run ends."""
        if self.run is not None and self.run.ask is not None:
            self._give(NOT_YET)

    def _does(self, ask: Ask) -> float | str:
        done = None if self._helper is None or ask.action is Action.CONFIRM else self._helper(ask)
        return (YES if ask.action is Action.CONFIRM else HERE_AND_DONE) if done is None else done

    def _give(self, answer: float | str) -> None:
        run = self.run
        if run is not None and run.ask is not None:
            run.measurement.runner.answer(run.ask.ask_id, answer)
            run.answered()

    def _turn(self, value: float) -> None:
        knob = self.hand.knob
        if knob is not None:
            self.hand.turn(knob.name, value)

    # --- what the run tells

    def tick(self, on_event: Callable[[Event], None]) -> None:
        """Take in what came since the last frame; `on_event` sees it too."""
        run = self.run
        if run is None:
            return

        def take(event: Event) -> None:
            run.take(event)
            on_event(event)

        before = run.prompt
        run.measurement.pump(take)
        if (
            run.prompt is not before
            and run.prompt is not None
            and run.prompt.want == LEAVE
            and self._helper is not None
        ):
            self.hand.let_go()
            self._helper(run.prompt)  # a hand that lets go
        self._confirm_simulated(run)
        for kept in run.kept:
            strokes.draw_kept(self.trail, kept, run.measurement.plan.frequency_hz)
        run.kept.clear()
        if run.concluded():
            self._mark(run)
        self._show_card(run)

    def _confirm_simulated(self, run: Guided) -> None:
        """The simulated bench confirms itself: what it has in is what it says, and nothing can burn."""
        if run.ask is not None and run.ask.ask.action is Action.CONFIRM and not self.runner.bench.identity.real:
            self._give(YES)

    def _mark(self, run: Guided) -> None:
        marks = marks_of(run.stated(run.row))
        if marks != self.trail.marks:
            self.trail.marks = marks
            self.trail.version += 1
        strokes.leave_out(self.trail, run.curve, run.row)

    def show(self) -> None:
        """Bring the column up to date."""
        if self.run is not None:
            self.page.show_run(self.run)
        if self.card.knob is not None and self.hand.knob is not None:
            self.card.knob.show_value(self.hand.knob.value)

    def _show_card(self, run: Guided) -> None:
        ask = Ask(Action.CONFIRM, HERE) if run.here_due else run.ask.ask if run.ask is not None else run.prompt
        if ask is None:
            self.card.put_away()
            return
        itself = self._helper is not None
        below = task_text.asked_below(ask, self._limits(run))
        if ask is run.prompt:
            turns = itself and ask.want != LEAVE
            self.card.show_ask(ask, below, task_text.TURN_FOR_ME if turns else "", knob=turns)
            return
        other = task_text.NOT_YET_BUTTON if ask.action is Action.CONFIRM and not run.here_due else ""
        self.card.show_ask(ask, below, task_text.answer_button(ask, does_itself=itself), other)

    def _limits(self, run: Guided) -> str:
        rig, plan = run.measurement.runner.rig, run.measurement.plan
        known = self.runner.calibration.output_vrms(run.current.wiring.output) is not None
        drive = f"{rig.limits.drive_vrms:.3g} V" if known else figures.decibels(run.measurement.runner.limit.fs, "dBFS")
        output = "" if plan.limit_vrms is None else f"{plan.limit_vrms:g} V"
        return task_text.limits_in_force(drive, output)

    # --- what the window shows

    def table(self, table: Table) -> Table:
        """Return what is on the table while a statement is measured: its tone, its load, its channel."""
        run = self.run
        if run is None:
            return table
        tone, row = run.tone, run.current
        level_fs = tone.level_fs if tone is not None and tone.on else 0.0
        wishes = Wishes(self.sounding, run.measurement.plan.frequency_hz, level_fs, row.wiring.input)
        rig = run.measurement.runner.rig
        wirings = tuple(attrs.evolve(each, load=row.load) if each == row.wiring else each for each in rig.wirings)
        return attrs.evolve(table, wishes=wishes, rig=attrs.evolve(rig, wirings=wirings))

    def silent_readout(self) -> Readout | None:
        """Return what stands in the reading's place while the tone is silent; None where the live reading goes on."""
        run = self.run
        if run is None or run.sounding:
            return None
        sentence = self._silent_words(run)
        if not run.running:
            return result_readout(run, sentence) or withheld_readout(sentence)
        return withheld_readout(sentence)

    def _silent_words(self, run: Guided) -> Sentence:
        why = run.why()
        if run.running:
            if run.ask is not None:
                return Sentence(task_text.WAITS_FOR_YOU, why or task_text.asked(run.ask.ask), Mark.PLAIN)
            return Sentence(task_text.MUTED if why else task_text.STARTING, why, self._mark_of(run))
        ended = run.ended
        ordinary = run.muted is not None and run.muted.kind in (Kind.CONTROL_RESTS, Kind.PASSED)
        detail = ("" if ordinary else why) or ("" if ended is None else ended.why)
        if run.failed:
            return Sentence(task_text.FAILED, "" if ended is None else ended.why, Mark.WARNING)
        done = ended is not None and ended.ending.value == "done"
        return Sentence(task_text.DONE if done else task_text.STOPPED, detail, self._mark_of(run))

    @staticmethod
    def _mark_of(run: Guided) -> Mark:
        return Mark.WARNING if task_text.warns(run.muted) else Mark.PLAIN
