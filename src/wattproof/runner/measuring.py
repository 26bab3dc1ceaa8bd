"""Runs one power procedure to its ending and gathers what it kept: for a command, a script or a window."""

import threading
import time
from collections.abc import Callable

import attrs

from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Limits, Rig
from wattproof.core.run import Ending
from wattproof.procedures.power_hand import power_by_hand
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan
from wattproof.procedures.power_rows import Place, Row, rows_of, settings_of
from wattproof.procedures.power_steps import power
from wattproof.procedures.requests import Kept, Procedure, Said
from wattproof.procedures.statement import PowerStatement, conclude
from wattproof.procedures.watch import ReaderFactory
from wattproof.runner.limits import DEFAULT_DRIVE_LIMIT_FS, DriveLimit
from wattproof.runner.live import Hand, Keeper, Runner
from wattproof.runner.screen import Ended, Event, ReadingKept, Told
from wattproof.runner.slew import DriveSlew

LOOK_S = 0.02  # how often the events of a run are looked at
_HARD_LIMIT = 1.05  # the runner's own limits stand this far above the plan's, which the procedure keeps by itself


@attrs.frozen(eq=False)
class Measured:
    """How a power procedure ended, and its statement, from whatever was kept."""

    ending: Ending
    why: str
    statement: PowerStatement
    rig: Rig


class Measurement:
    """One power procedure on an open bench. `on_event` sees every event, in the thread that calls `run`."""

    def __init__(  # noqa: PLR0913, PLR0917 - a measurement is put together from this many parts
        self,
        bench: Bench,
        rig: Rig,
        calibration: Calibration,
        plan: PowerPlan,
        new_reader: ReaderFactory,
        hand: Hand | None = None,
        keeper: Keeper | None = None,
    ) -> None:
        self.plan = plan
        self.place = _place(bench, rig, calibration, new_reader)
        self.rows: tuple[Row, ...] = rows_of(plan, self.place)
        for row in self.rows:
            settings_of(plan, self.place, row)  # volts that are not known are refused here, before anything is asked
        limited = attrs.evolve(rig, limits=_hard_limits(plan, rig))
        self.runner = Runner(bench, limited, calibration, keeper=keeper, hand=hand, slew=DriveSlew(plan.rise_db_per_s))
        self._records: list[Kept | Said] = []
        self._ended: Ended | None = None
        self._lock = threading.Lock()

    def run(self, on_event: Callable[[Event], None] = lambda _event: None) -> Measured:
        """Run to the end. Whatever `on_event` raises, KeyboardInterrupt too, leaves silence behind and is raised on."""
        self.start()
        try:
            while self._ended is None:
                self.pump(on_event)
                time.sleep(LOOK_S)
        finally:
            self.runner.stop()
            self.pump()
        return self.measured()

    def start(self) -> None:
        """Start without waiting: a window pumps the events on its own timer.

        Raises:
            WrongUseError: the bench has no output to raise the drive of, or a run is under way.
        """
        self.runner.start(self._procedure())

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

    def measured(self) -> Measured:
        """Return what was kept so far, and what it amounts to."""
        ended = self._ended or Ended(Ending.STOPPED)
        statement = conclude(self.plan, self.rows, tuple(self._records))
        return Measured(ended.ending, ended.why, statement, self.runner.rig)

    def _procedure(self) -> Procedure:
        if isinstance(self.plan, StepsPlan):
            if not self.place.ceilings_fs:
                raise WrongUseError("this bench has no output to drive an amplifier; measure power-by-hand reads it")
            return power(self.plan, self.place)
        assert isinstance(self.plan, HandPlan)  # noqa: S101 - the two plans that there are
        return power_by_hand(self.plan, self.place)


def _place(bench: Bench, rig: Rig, calibration: Calibration, new_reader: ReaderFactory) -> Place:
    identity = bench.identity
    limit = DriveLimit(rig, calibration, DEFAULT_DRIVE_LIMIT_FS)
    ceilings = {output: limit.ceiling_fs((output,)) for output in range(1, identity.outputs + 1)}
    return Place(identity.rate_hz, identity.inputs, rig, calibration, ceilings, new_reader, identity.real)


def _hard_limits(plan: PowerPlan, rig: Rig) -> Limits:
    """Return the rig's limits, or the plan's with a margin where they are lower: the last line of defence."""
    limits = rig.limits

    def lower(own: float | None, planned: float | None) -> float | None:
        known = [value for value in (own, None if planned is None else planned * _HARD_LIMIT) if value is not None]
        return min(known) if known else None

    return attrs.evolve(
        limits,
        output_vrms=lower(limits.output_vrms, plan.limit_vrms),
        power_w=lower(limits.power_w, plan.limit_w),
        over_rating_s=lower(limits.over_rating_s, plan.limit_over_s),
    )
