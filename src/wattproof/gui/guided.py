"""What a guided power run has told so far: what is asked, what it does, its strokes and its statement. Pure of Qt."""

import time
from collections.abc import Callable
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from functools import partial

import attrs

from wattproof.core.notes import Kind, Note
from wattproof.core.run import Ending
from wattproof.gui import task_text
from wattproof.procedures.driving import HERE
from wattproof.procedures.power_rows import Row
from wattproof.procedures.power_switching import LEAVE
from wattproof.procedures.requests import Ask, Kept, Progress, Said
from wattproof.procedures.statement import CurveReading, PowerStatement, StatedRow, conclude
from wattproof.runner.measuring import Measurement
from wattproof.runner.screen import (
    Asked,
    Ended,
    Event,
    Progressed,
    Prompted,
    ReadingKept,
    Refused,
    Told,
    ToneChanged,
)

CONCLUDED_EVERY_S = 0.7  # often enough for marks to be seen as they are crossed
_REST = 4.0  # times what a conclusion took, before the next one: the measurement needs the processor too


def _one_thread() -> Executor:
    return ThreadPoolExecutor(1, "wattproof-conclude")


@attrs.define(eq=False)
class Guided:
    """One run of the power statement. `take` is told every event; the rest is what the window shows.

    The statement is made in a thread of its own, so that the window never waits for it: of the row that is measured
    while it runs, of everything once it is over.
    """

    measurement: Measurement
    clock: Callable[[], float] = time.monotonic
    executor: Executor = attrs.field(factory=_one_thread)
    ask: Asked | None = None
    prompt: Ask | None = None
    here_due: bool = False
    progress: Progress | None = None
    tone: ToneChanged | None = None
    muted: Note | None = None
    muted_words: str = ""
    ended: Ended | None = None
    refused: int = 0
    row: int = 0
    statement: PowerStatement | None = None  # of all rows, once the run is over
    curve: tuple[CurveReading, ...] = ()  # of the last conclusion
    kept: list[Kept] = attrs.field(factory=list)  # since they were fetched for the trail
    _records: list[Kept | Said] = attrs.field(factory=list)
    _rows: dict[int, StatedRow] = attrs.field(factory=dict)
    _due: bool = False
    _job: Future[PowerStatement] | None = None
    _begun_s: float = 0.0
    _next_s: float = 0.0

    @property
    def running(self) -> bool:
        """Whether the run is under way."""
        return self.ended is None

    @property
    def sounding(self) -> bool:
        """Whether the tone is on."""
        return self.tone is not None and self.tone.on

    @property
    def current(self) -> Row:
        """The row that is measured, or was last."""
        return self.measurement.rows[self.row]

    @property
    def hands_off(self) -> bool:
        """Whether a stroke has just ended: what the hand did is no longer what is done."""
        following = self.progress is not None and self.progress.doing.kind is Kind.FOLLOWING
        return following and self.prompt is not None and self.prompt.want == LEAVE

    def take(self, event: Event) -> None:
        """Take in one event."""
        match event:
            case Asked():
                self.ask = event
            case Prompted(ask=ask):
                self._prompted(ask)
            case Progressed(progress=progress):
                self.progress = progress
            case ToneChanged():
                self._tone_changed(event)
            case Told(said=said):
                self._records.append(said)
                self.row, self._due = said.row, True
                if task_text.mutes(said.note):
                    self.muted = said.note
            case ReadingKept(kept=kept):
                self._keep(kept)
            case Refused():
                self.refused += 1
            case Ended():
                self.ended, self.ask, self.prompt, self.here_due = event, None, None, False
                self._due = True
            case _:
                pass

    def answered(self) -> None:
        """Forget the question: it was answered."""
        self.ask = None

    def said_here(self) -> None:
        """Forget that "I am here" is due: it was said."""
        self.here_due = False

    def concluded(self) -> bool:
        """Have the statement made anew where it is due, and return whether a newer one has come."""
        now = self.clock()
        news = self._fetched(now)
        if self._due and self._job is None and (now >= self._next_s or not self.running):
            self._due, self._begun_s = False, now
            work = self._whole if not self.running else partial(self._of_row, self.row, tuple(self._records))
            self._job = self.executor.submit(work)
        return news

    @property
    def settled(self) -> bool:
        """Whether the run is over and its statement made."""
        return not self.running and not self._due and self._job is None

    def close(self) -> None:
        """Let go of the thread."""
        self.executor.shutdown(wait=False, cancel_futures=True)

    def _fetched(self, now: float) -> bool:
        job = self._job
        if job is None or not job.done():
            return False
        self._job = None
        self._next_s = now + max(CONCLUDED_EVERY_S, _REST * (now - self._begun_s))
        made = job.result()
        self.curve = made.curve
        for stated in made.rows:
            self._rows[stated.row.index] = stated
        if not self.running and not self._due:
            self.statement = made
        return True

    def _whole(self) -> PowerStatement:
        return self.measurement.measured().statement

    def _of_row(self, index: int, records: tuple[Kept | Said, ...]) -> PowerStatement:
        return conclude(self.measurement.plan, (self.measurement.rows[index],), records)

    def stated(self, index: int) -> StatedRow | None:
        """Return what is stated of a row so far."""
        return self._rows.get(index)

    def over(self, index: int) -> bool:
        """Return whether nothing more will be found out about a row."""
        return not self.running or index < self.row

    def why(self) -> str:
        """Return in words why the tone is silent, "" where nothing was said about it."""
        if self.muted is not None:
            return task_text.doing(self.muted)
        return self.muted_words

    @property
    def failed(self) -> bool:
        """Whether it broke off for a reason of the bench or the program."""
        return self.ended is not None and self.ended.ending is Ending.FAILED

    def _prompted(self, ask: Ask) -> None:
        if ask.want == HERE:
            self.here_due = True
        else:
            self.prompt = ask

    def _keep(self, kept: Kept) -> None:
        if kept.mark is None:
            return
        self._records.append(kept)
        self.row, self._due = kept.mark.row, True
        self.kept.append(kept)

    def _tone_changed(self, event: ToneChanged) -> None:
        self.tone = event
        if event.on:
            self.muted, self.muted_words = None, ""
        else:
            self.prompt, self.here_due = None, False
            self.muted_words = event.why
