"""Drives a procedure on a bench in a thread of its own, and keeps the promise of silence on every way out."""

import logging
import threading
from collections.abc import Callable

import attrs

from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Note
from wattproof.core.reading import Reading
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.core.signal import Tone
from wattproof.procedures.requests import (
    Acquire,
    Ask,
    Kept,
    Play,
    Procedure,
    Progress,
    Prompt,
    Record,
    Request,
    Said,
    Shown,
    Wishes,
)
from wattproof.runner.acquire import Blocks
from wattproof.runner.asks import Asks
from wattproof.runner.drive import Answer, Drive
from wattproof.runner.held import Held, RawCapture
from wattproof.runner.limits import DEFAULT_DRIVE_LIMIT_FS, DriveLimit, OverRating, exceeded
from wattproof.runner.output import Output
from wattproof.runner.screen import (
    Asked,
    Ended,
    Progressed,
    Prompted,
    ReadingKept,
    ReadingsTaken,
    Refused,
    Screen,
    Told,
)
from wattproof.runner.slew import DriveSlew
from wattproof.runner.wishes import Change, WishBook, check_frequency, check_socket

Keeper = Callable[[Kept, RawCapture], None]
Hand = Callable[[Ask], float | str | None]  # does what a person is asked for, or leaves it to one (None)
LETTING_GO_S = 1.0  # a thread that has told its ending has nothing left to do; only a hung bench keeps it
_log = logging.getLogger(__name__)


class _Run:
    """What belongs to one run: its stop event, its blocks, what it kept, and whether its ending was told."""

    def __init__(self, bench: Bench, screen: Screen) -> None:
        self.stop = threading.Event()
        self.screen = screen
        self.blocks = Blocks(bench, self.stop, self._refuse)
        self.held = Held(bench, self.stop)
        self.over_rating = OverRating()
        self.kept = 0
        self.refused = 0
        self.over = False

    def _refuse(self, why: Note) -> None:
        self.refused += 1
        self.screen.tell(Refused(why))


class Runner:
    """Runs one procedure at a time on an open bench.

    `wish`, `answer`, `mute`, `stop` and the drive limit may be called from any thread; none of them waits for the
    measurement, and only `stop` waits at all, for at most its deadline. The bench stays open between runs; `close`
    ends the run and the bench. `keeper` takes each kept record with its raw capture, in the run's thread. `hand` does
    what a person is asked for where the bench can, in the run's thread. With `slew` the drive rises no faster.
    """

    def __init__(  # noqa: PLR0913 - a runner is put together from this many parts
        self,
        bench: Bench,
        rig: Rig,
        calibration: Calibration,
        *,
        keeper: Keeper | None = None,
        drive_limit_fs: float = DEFAULT_DRIVE_LIMIT_FS,
        hand: Hand | None = None,
        slew: DriveSlew | None = None,
    ) -> None:
        for wiring in rig.wirings:
            check_socket("input", wiring.input, bench.identity.inputs)
            if bench.identity.outputs:  # a recording has none: its tone was played long ago
                check_socket("output", wiring.output, bench.identity.outputs)
        self.bench = bench
        self.calibration = calibration
        self.screen = Screen()
        self.limit = DriveLimit(rig, calibration, drive_limit_fs)
        self._rig = rig
        self._keeper = keeper
        self._hand = hand
        self._slew = slew
        self._here = 0
        self._lock = threading.Lock()
        self._book = WishBook(bench.identity, self.outputs, self.limit)
        self._asks = Asks()
        self._output = Output(bench, self.limit, self.screen, self._level_changed)
        self._run: _Run | None = None
        self._thread: threading.Thread | None = None

    @property
    def rig(self) -> Rig:
        """The rig, with the drive limit as it stands."""
        return attrs.evolve(self._rig, limits=attrs.evolve(self._rig.limits, drive_vrms=self.limit.vrms))

    @property
    def outputs(self) -> tuple[int, ...]:
        """The outputs that the rig's channels are driven from; none where the bench has none."""
        wired = {wiring.output for wiring in self._rig.wirings}
        return tuple(sorted(output for output in wired if output <= self.bench.identity.outputs))

    @property
    def wishes(self) -> Wishes:
        """What the person wants, as it stands."""
        return self._book.standing

    @property
    def running(self) -> bool:
        """Whether a run is under way."""
        run = self._run
        return run is not None and not run.over

    @property
    def begun(self) -> bool:
        """Whether a run was ever started."""
        return self._run is not None

    @property
    def muted(self) -> bool:
        """Whether the output is latched silent; a new run releases it."""
        return self._output.muted

    def kept(self) -> int:
        """Return how many readings the run under way, or the last one, has kept so far."""
        run = self._run
        return run.kept if run is not None else 0

    def refused(self) -> int:
        """Return how many blocks the run under way, or the last one, has refused so far."""
        run = self._run
        return run.refused if run is not None else 0

    def start(self, procedure: Procedure) -> None:
        """Release the mute latch and drive a procedure in a thread of its own.

        Raises:
            WrongUseError: a run is under way, or the last one still hangs on the bench.
        """
        if not self.running and self._thread is not None:
            self._thread.join(LETTING_GO_S)
        with self._lock:
            if self._thread is not None and self._thread.is_alive():
                raise WrongUseError("a run is still under way; stop it before the next one starts")
            run = self._run = _Run(self.bench, self.screen)
            self._output.release()
            if self._slew is not None:
                self._slew.restart()
            args = (run, procedure)
            self._thread = threading.Thread(target=self._live, args=args, name="wattproof-run", daemon=True)
            self._thread.start()

    def stop(self, deadline_s: float = 2.0) -> None:
        """Mute at once, end the run, and wait for it at most deadline_s; past that it is given up, told as failed."""
        self.mute()
        run, thread = self._run, self._thread
        if run is None or thread is None:
            return
        run.stop.set()
        self._asks.wake()
        if thread is threading.current_thread():
            return
        thread.join(deadline_s)
        if thread.is_alive():
            self._end(run, Ending.FAILED, f"the bench did not answer within {deadline_s:g} s; the output is muted")

    def close(self, deadline_s: float = 2.0) -> None:
        """Stop, and let go of the bench."""
        self.stop(deadline_s)
        self.bench.close()

    def take_bench(self, bench: Bench) -> None:
        """Go on with a bench that was opened anew, the tone off; wishes and limits stay. The old one is closed by then.

        Raises:
            WrongUseError: a run is under way, or it is another device: its volts may be others, so its limits too.
        """
        before, after = self.bench.identity, bench.identity
        if self.running:
            raise WrongUseError("a run is still under way; stop it before the bench is changed")
        if (before.name, before.inputs, before.outputs) != (after.name, after.inputs, after.outputs):
            raise WrongUseError(f"{after.name} is not the bench that was lost, {before.name}; open it by itself")
        self.bench = bench
        self._output.take_bench(bench)
        self._book.take_bench(after)

    def mute(self, why: str = "") -> None:
        """Fall silent at once and stay so until a new run starts."""
        self._output.mute(why)
        self._book.tone_off()

    def wish(
        self,
        *,
        tone_on: bool | None = None,
        frequency_hz: float | None = None,
        level_fs: float | None = None,
        channel: int | None = None,
    ) -> None:
        """Change what is wanted of a watch; what is None stays. A tone that is turned off is silent at once.

        Raises:
            WrongUseError: a value that the bench cannot do, a drive above the limit, or a tone while muted.
        """
        change = Change(tone_on, frequency_hz, level_fs, channel)
        self._book.change(change, lambda: not (self.running and self._output.muted))
        if tone_on is False:
            self._output.hush()

    def set_drive_limit_vrms(self, value: float) -> None:
        """Set the drive limit in V rms. A tone that is now above it falls silent at once.

        Raises:
            WrongUseError: not a voltage from 0 to 50 V rms.
        """
        self._change_limit(lambda: self.limit.set_vrms(value))

    def set_drive_limit_fs(self, value: float) -> None:
        """Set the drive limit for outputs whose volts are not known. A tone that is now above it falls silent at once.

        Raises:
            WrongUseError: not a ratio from 0 to 1.
        """
        self._change_limit(lambda: self.limit.set_fs(value))

    def answer(self, ask_id: int, value: float | str) -> None:
        """Answer what the person was asked (event Asked).

        Raises:
            WrongUseError: that question is not open.
        """
        self._asks.answer(ask_id, value)

    def here(self) -> None:
        """Say "I am here", which a long test of warm parts asks for. From any thread."""
        with self._lock:
            self._here += 1

    def _change_limit(self, change: Callable[[], None]) -> None:
        def change_and_obey() -> None:
            change()
            self._book.obey_limit()

        self._output.change_limit(change_and_obey)

    def _level_changed(self) -> None:
        run = self._run
        if run is not None:
            run.blocks.level_changed()

    def _live(self, run: _Run, procedure: Procedure) -> None:
        ending, why = Ending.FAILED, "the run broke off"
        drive = Drive(procedure, lambda request: self._answer(run, request), lambda it: self._take(run, it), run.stop)
        try:
            ending, why = drive.run()
        except Exception as error:  # noqa: BLE001 - whatever breaks, the tone falls silent and the ending says so
            _log.exception("a run broke off")
            said = " ".join(str(error).split())
            why = f"unexpected {type(error).__name__}: {said}; the log file has the details"
        finally:
            try:
                self.mute()
            finally:
                self._end(run, ending, why)

    def _end(self, run: _Run, ending: Ending, why: str) -> None:
        with self._lock:
            told, run.over = run.over, True
        if not told:
            _log.info("a run ended: %s %s", ending, why)
            self.screen.tell(Ended(ending, why))

    def _answer(self, run: _Run, request: Request) -> Answer:
        match request:
            case Play(tone):
                return self._play(run, tone)
            case Acquire():
                block = run.blocks.acquire(request)
                if self._keeper is not None:
                    run.held.hold(block)
                return block
            case Ask():
                if self._slew is not None:
                    self._slew.restart()
                done = None if self._hand is None else self._hand(request)
                if done is not None:
                    return done
                ask_id = self._asks.open()
                self.screen.tell(Asked(ask_id, request))
                return self._asks.wait(run.stop)
            case _:
                hushed = self._output.heard()  # before the wishes are looked at: a silence from here on holds
                wishes = attrs.evolve(self.wishes, here=self._here)
                return attrs.evolve(wishes, tone_on=False) if hushed else wishes

    def _play(self, run: _Run, tone: Tone) -> int:
        for output in tone.outputs:
            check_socket("output", output, self.bench.identity.outputs)
        check_frequency(tone.frequency_hz, self.bench.identity.rate_hz)
        if self._slew is not None:
            self._slew.check(tone, self.bench.next_frame / self.bench.identity.rate_hz)
        stands = self._output.play(tone)
        if self._slew is not None:
            self._slew.played(tone, stands / self.bench.identity.rate_hz)
        run.blocks.tone_stands(stands, tone)
        return stands

    def _take(self, run: _Run, record: Record) -> None:
        if run.over:
            return
        readings: tuple[Reading, ...] = ()
        match record:
            case Shown(readings=readings):
                self.screen.show(record)
                self.screen.tell(ReadingsTaken(readings))
            case Kept(reading=reading):
                if self._keeper is not None:
                    self._keeper(record, run.held.release(reading.span))
                run.kept += 1
                readings = (reading,)
                self.screen.tell(ReadingKept(record))
            case Said():
                self.screen.tell(Told(record))
            case Progress():
                self.screen.tell(Progressed(record))
            case Prompt(ask=ask):
                self._prompt(ask)
        over = run.over_rating.after(readings, self._rig)
        why = over or next(filter(None, (exceeded(reading, self._rig.limits) for reading in readings)), "")
        if why and self._output.sounding is not None:
            self.mute(why)

    def _prompt(self, ask: Ask) -> None:
        """Tell the screen what may be done meanwhile; a hand that did it said by that that somebody is here."""
        self.screen.tell(Prompted(ask))
        if self._hand is not None and self._hand(ask) is not None:
            self.here()
