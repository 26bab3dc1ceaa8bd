"""The five-second check before a run: a tone, what the meter shows, and whether the gain still is the same."""

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import declared
from wattproof.core.quantity import STATISTICS, Quantity
from wattproof.core.reading import Reading, ReadingSettings, Reference, State
from wattproof.core.rig import Rig, Wiring
from wattproof.core.signal import Capture, Tone
from wattproof.procedures.absolute import absolute
from wattproof.procedures.calibrate import METER, SETTLE_S, Doing, number_of
from wattproof.procedures.level_calibration import Meter, meter_reading, propose
from wattproof.procedures.read_recording import read_recording
from wattproof.procedures.requests import Acquire, Action, Ask, Play, Shown
from wattproof.procedures.still_the_same import Verdict, against_loop, against_voltage, refuse_moved


@attrs.frozen
class SamePlan:
    """How the check is done."""

    level_fs: float = declared(
        0.05, label="Drive", minimum=1e-4, maximum=1.0, help="ratio to full scale; low, since an amplifier may be wired"
    )
    seconds: float = declared(5.0, label="Length", unit="s", minimum=0.5, maximum=60.0, help="how long is read")


@attrs.frozen(eq=False)
class SameCheck:
    """The check of one wired channel against its calibration. Its methods are parts of a procedure's generator."""

    plan: SamePlan
    rig: Rig
    wiring: Wiring
    calibration: Calibration
    rate_hz: float

    def by_meter(self, meter: Meter) -> Doing[Verdict]:
        """Compare the reading at the amplifier's terminals with what the meter shows there.

        Raises:
            WrongUseError: the gain has moved, the tone could not be read, no scale is known, or the reading is a slip.
        """
        frequency_hz = propose(meter).frequency_hz
        raw = yield from self._read(frequency_hz)
        level = raw.level_fs
        volts = absolute(raw, self.rig, self.calibration, self.plan.level_fs).level_vrms
        if volts is None or level is None:
            raise WrongUseError(f"no volts are known for input {self.wiring.input}; calibrate with a meter first")
        shown = yield Ask(Action.CONFIRM, METER, f"the terminals of channel {self.wiring.name}; {frequency_hz:g} Hz")
        known = meter_reading(meter, number_of(shown), volts.value)
        parts = (attrs.evolve(part, u=part.u / level.value) for part in volts.parts if part.source != STATISTICS)
        scale = Quantity(volts.value / level.value, "V", tuple(parts))
        verdict = against_voltage(level, known, scale)
        refuse_moved(verdict, raw)
        return verdict

    def by_loop(self) -> Doing[Verdict]:
        """Compare a direct loop's gain with the calibrated one: output times input gain, and neither alone.

        Raises:
            WrongUseError: the product has moved, no loop was calibrated, or the tone could not be read.
        """
        loop = self.calibration.loop(self.wiring.input)
        if loop is None:
            raise WrongUseError(f"no loop into input {self.wiring.input} was calibrated; calibrate it first")
        raw = yield from self._read(loop.frequency_hz)
        assert raw.fundamental_fs is not None  # noqa: S101 - `_read` has looked; tells the type checker
        verdict = against_loop(raw.fundamental_fs.scaled(1.0 / self.plan.level_fs, "1"), loop.gain)
        refuse_moved(verdict, raw)
        return verdict

    def _read(self, frequency_hz: float) -> Doing[Reading]:
        yield Play(Tone(frequency_hz, self.plan.level_fs, (self.wiring.output,)))
        capture = yield Acquire(round(self.plan.seconds * self.rate_hz), None, SETTLE_S)
        assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
        settings = ReadingSettings(high_hz=min(20_000.0, self.rate_hz / 2.0), reference=Reference.FUNDAMENTAL)
        (reading,) = read_recording(capture, settings, fundamental_hz=frequency_hz, channels=(self.wiring.input,))
        if reading.state is not State.OK or reading.fundamental_fs is None:
            raise WrongUseError(
                f"input {self.wiring.input}: the tone could not be read ({reading.state}); look at wiring and level"
            )
        yield Shown((reading,))
        return reading
