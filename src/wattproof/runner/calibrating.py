"""Runs a calibration on an open bench: a bench that can plugs its own table, else a person is asked."""

import threading
from collections.abc import Callable
from datetime import UTC, datetime
from typing import Protocol, runtime_checkable

import attrs

from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.connection import Connection
from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.core.rig import Rig, Wiring
from wattproof.core.run import Ending
from wattproof.procedures.calibrate import METER, CalibratePlan, Calibrating, joins_of
from wattproof.procedures.calibration_record import Header, conclude
from wattproof.procedures.level_calibration import Meter
from wattproof.procedures.requests import Action, Ask
from wattproof.runner.live import Runner
from wattproof.runner.screen import Asked, Ended, Event

DONE = "done"
LOOK_S = 0.02
MOST_CHANNELS = 2

Tell = Callable[[Event], None]
Person = Callable[[Ask], float | str]


@runtime_checkable
class Pluggable(Protocol):
    """A bench that can plug its own cables and read its own voltmeter, as the simulated one does."""

    def connect(self, name: str) -> None:
        """Plug the table as a `core.connection.Connection` says."""
        ...

    def meter_vrms(self, output: int) -> float:
        """Return what a voltmeter shows at an output, V rms."""
        ...


class TableHand:
    """Answers what a bench can do by itself; None leaves it to a person. Its meter shows whole steps of a digit."""

    def __init__(self, bench: Bench, meter: Meter | None) -> None:
        self._bench = bench
        self._step_v = meter.step_v if meter is not None else 0.0

    def __call__(self, ask: Ask) -> float | str | None:
        """Do what is asked and return the answer, or None where the bench cannot."""
        if not isinstance(self._bench, Pluggable):
            return None
        match ask:
            case Ask(action=Action.CONNECT, want=str(want)):
                self._bench.connect(want)
                return DONE
            case Ask(action=Action.CONFIRM, want=want) if want == METER:
                sounding = max(self._bench.meter_vrms(output + 1) for output in range(self._bench.identity.outputs))
                return round(sounding / self._step_v) * self._step_v
            case _:
                return None


def rig_for(bench: Bench, wanted: Rig | None) -> Rig:
    """Return the rig to calibrate: the one that is wanted, the bench's own, or each output joined to its own input."""
    declared = getattr(bench, "rig", None)
    if wanted is not None:
        return wanted
    if isinstance(declared, Rig):
        return declared
    channels = min(MOST_CHANNELS, bench.identity.inputs, bench.identity.outputs)
    wirings = tuple(Wiring(f"channel {socket}", socket, socket) for socket in range(1, channels + 1))
    return Rig("loop", wirings or (Wiring(),))


@attrs.frozen(eq=False)
class CalibrationRun:
    """A calibration that can be run once, in the thread of whoever calls `run`; a window uses its parts."""

    runner: Runner
    calibrating: Calibrating
    header: Header
    meter: Meter | None

    def run(self, tell: Tell, person: Person) -> Calibration:
        """Run to the end and return the record; `tell` gets every event, `person` does what the bench cannot.

        Raises:
            WrongUseError: the calibration failed; the line says what is wrong and what to do.
            StoppedError: it was stopped.
        """
        self.runner.start(self.calibrating.steps())
        waits = threading.Event()
        try:
            while True:
                for event in self.runner.screen.drain():
                    tell(event)
                    if isinstance(event, Asked):
                        self.runner.answer(event.ask_id, person(event.ask))
                    if isinstance(event, Ended):
                        return self._concluded(event)
                waits.wait(LOOK_S)
        finally:
            self.runner.stop()

    def _concluded(self, event: Ended) -> Calibration:
        if event.ending is Ending.STOPPED:
            raise StoppedError(event.why or "the calibration was stopped; nothing was stored")
        if event.ending is Ending.FAILED:
            raise WrongUseError(event.why)
        return self.record()

    def record(self) -> Calibration:
        """Return the record of what was found; the run must be done."""
        return conclude(self.calibrating.findings, self.header, self.meter, self.runner.bench.calibration)


def make_calibration(  # noqa: PLR0913 - what is calibrated, how, and who does what is asked
    bench: Bench,
    plan: CalibratePlan,
    meter: Meter | None,
    rig: Rig | None = None,
    *,
    raise_limit: bool = False,
    by_person: bool = False,
) -> CalibrationRun:
    """Return a calibration of an open bench, ready to run. The drive never passes the runner's limit.

    `raise_limit` says that a person named the plan's highest drive and wants the limit raised to it; `by_person` that
    a person plugs and reads also where the bench could do it by itself.

    Raises:
        WrongUseError: the bench has no output, or the rig joins sockets that it does not have.
    """
    if not bench.identity.outputs:
        raise WrongUseError(
            f"{bench.identity.name} has no output; a calibration needs a device that plays and captures"
        )
    wired = rig_for(bench, rig)
    runner = Runner(bench, wired, bench.calibration, hand=None if by_person else TableHand(bench, meter))
    joins = joins_of(wired)
    outputs = tuple(join.output for join in joins)
    if raise_limit:
        scales = [bench.calibration.output_vrms(output) for output in outputs]
        runner.set_drive_limit_fs(plan.highest_fs)
        runner.set_drive_limit_vrms(max([plan.highest_fs * scale.value for scale in scales if scale] or [0.0]))
    ceiling_fs = runner.limit.ceiling_fs(outputs)
    identity = bench.identity
    calibrating = Calibrating(plan, joins, identity.rate_hz, ceiling_fs, meter)
    header = Header(identity.name, datetime.now(UTC).date().isoformat())
    return CalibrationRun(runner, calibrating, header, meter)


def plug_words(ask: Ask) -> str:
    """Return what a person is to plug or to read, in plain words."""
    if ask.action is Action.CONNECT:
        return _CONNECT[Connection(str(ask.want))].format(joins=ask.check)
    if ask.want == METER:
        return f"Read the AC voltage at {ask.check.partition(';')[0]} with the meter, and give it in V"
    return f"{ask.action}: {ask.want} {ask.check}".strip()


_CONNECT = {
    Connection.DIRECT: (
        "Take every cable off the amplifier. Join output to input directly: {joins}. Phantom power off, direct "
        "monitoring off, then leave the gain knobs as they are"
    ),
    Connection.PAD: (
        "Leave the load of the direct loop on the output, and put the attenuator (20 to 30 dB) between: {joins}"
    ),
    Connection.AMPLIFIER: "Done. Take the loop away; leave the gain knobs as they are",
}
