"""Runs one of the procedures around the power statement to its ending and gathers what it kept."""

import threading
import time
from collections.abc import Callable, Mapping, Sequence
from types import MappingProxyType
from typing import Any, Protocol, runtime_checkable

import attrs

from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.connection import Connection
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.procedures.around_plan import AroundPlace, AroundPlan
from wattproof.procedures.efficiency import SUPPLY
from wattproof.procedures.gain import AT
from wattproof.procedures.power_rows import rows_of
from wattproof.procedures.power_switching import FULL
from wattproof.procedures.requests import Action, Ask, Kept, Procedure, Said
from wattproof.procedures.response import FLAT, SET
from wattproof.procedures.watch import ReaderFactory
from wattproof.runner.calibrating import Pluggable
from wattproof.runner.hands import BenchHand
from wattproof.runner.limits import DEFAULT_DRIVE_LIMIT_FS, DriveLimit
from wattproof.runner.live import Hand, Runner
from wattproof.runner.screen import Ended, Event, ReadingKept, Told
from wattproof.runner.slew import DriveSlew

LOOK_S = 0.02
RISE_DB_PER_S = 20.0
DONE = "done"
NEUTRAL = ("bass", "treble", "loudness", "rumble")  # what "flat" sets to zero on a bench of its own


@runtime_checkable
class Metered(Protocol):
    """A bench with meters at the amplifier's supply, as the simulated one has."""

    def supply_meters(self) -> tuple[float, float]:
        """Return volts and amperes."""
        ...


@attrs.frozen(eq=False)
class Job:
    """A procedure and its pure half: what to run for a plan, and what its records amount to."""

    name: str
    run: Callable[[Any, AroundPlace], Procedure]
    conclude: Callable[[Any, AroundPlace, Sequence[Kept | Said]], Any]


@attrs.frozen(eq=False)
class Found:
    """How a procedure ended, and its result from whatever was kept."""

    name: str
    ending: Ending
    why: str
    result: Any
    rig: Rig


class Sitting:
    """One procedure on an open bench. `on_event` sees every event, in the thread that calls `run`."""

    def __init__(  # noqa: PLR0913, PLR0917 - it is put together from this many parts
        self,
        bench: Bench,
        rig: Rig,
        calibration: Calibration,
        plan: AroundPlan,
        job: Job,
        new_reader: ReaderFactory,
        hand: Hand | None = None,
    ) -> None:
        self.plan, self.job = plan, job
        identity = bench.identity
        limit = DriveLimit(rig, calibration, DEFAULT_DRIVE_LIMIT_FS)
        ceilings = {output: limit.ceiling_fs((output,)) for output in range(1, identity.outputs + 1)}
        self.place = AroundPlace(
            identity.rate_hz,
            identity.inputs,
            rig,
            calibration,
            ceilings,
            new_reader,
            identity.real,
            phase_from_zero=bool(getattr(bench, "phase_from_zero", False)),
        )
        self.rows = rows_of(plan.guarded(), self.place)
        self.runner = Runner(bench, rig, calibration, hand=hand, slew=DriveSlew(RISE_DB_PER_S))
        self._records: list[Kept | Said] = []
        self._ended: Ended | None = None
        self._told = threading.Lock()

    def run(self, on_event: Callable[[Event], None] = lambda _event: None) -> Found:
        """Run to the end. Whatever `on_event` raises, KeyboardInterrupt too, leaves silence behind and is raised on."""
        self.start()
        try:
            while self._ended is None:
                self.pump(on_event)
                time.sleep(LOOK_S)
        finally:
            self.runner.stop()
            self.pump()
        return self.found()

    def start(self) -> None:
        """Start without waiting.

        Raises:
            WrongUseError: a run is under way.
        """
        self.runner.start(self.job.run(self.plan, self.place))

    def pump(self, on_event: Callable[[Event], None] = lambda _event: None) -> None:
        """Take what the run told since the last time."""
        for event in self.runner.screen.drain():
            match event:
                case ReadingKept(kept=kept):
                    self._records.append(kept)
                case Told(said=said):
                    self._records.append(said)
                case Ended():
                    self._ended = event
                case _:
                    pass
            on_event(event)

    def found(self) -> Found:
        """Return what was kept so far, and what it amounts to."""
        ended = self._ended or Ended(Ending.STOPPED)
        result = self.job.conclude(self.plan, self.place, tuple(self._records))
        return Found(self.job.name, ended.ending, ended.why, result, self.runner.rig)


class AroundHand:
    """Does on a bench of its own what these procedures ask for beyond what `BenchHand` does.

    `settings` are what a person wants of the bench's controls; they count from "as set" on, the knob from "full" on.
    """

    def __init__(self, bench: Bench, settings: Mapping[str, float] = MappingProxyType({})) -> None:
        self._bench = bench
        self._settings = dict(settings)
        self._plain = BenchHand(bench)

    def prepare(self) -> None:
        """Set what was asked for, before anything sounds.

        Raises:
            WrongUseError: the bench has no such control.
        """
        for name, value in self._settings.items():
            self._bench.turn(name, value)

    def __call__(self, ask: Ask) -> float | str | None:
        """Do what is asked and return the answer, or None where no control of the bench does it."""
        match ask:
            case Ask(action=Action.TURN, want=want) if want == FULL and "knob" in self._settings:
                self._bench.turn("knob", self._settings["knob"])
            case Ask(action=Action.TURN, want=want) if want in {FLAT, SET}:
                for name in NEUTRAL:
                    self._bench.turn(name, self._settings.get(name, 0.0) if want == SET else 0.0)
            case Ask(action=Action.TURN, want=str(want)) if want.startswith(AT):
                self._bench.turn("knob", float(want.removeprefix(AT)))
            case Ask(action=Action.CONNECT, want=str(want)):
                if not isinstance(self._bench, Pluggable):
                    return None
                if want in set(Connection):
                    self._bench.connect(want)
            case Ask(action=Action.CONFIRM, want=want) if want == SUPPLY:
                if not isinstance(self._bench, Metered):
                    return None
                volts, amperes = self._bench.supply_meters()
                return f"{volts:.9g}:{amperes:.9g}"
            case _:
                return self._plain(ask)
        return DONE
