"""Calibration by loopback: wiring, delay, response, noise, levels, crosstalk, and a meter; direct and through a pad.

Nothing of an amplifier is in the way: every level goes from an output back into an input. The pad, with the direct
loop's load left on the output, tells the two converters apart (see `dsp.separation`).
"""

from collections.abc import Generator, Sequence
from enum import StrEnum
from typing import TypeVar

import attrs
import numpy as np

from wattproof.core.connection import Connection
from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, note
from wattproof.core.reading import Reading, ReadingSettings, Reference, State
from wattproof.core.rig import Rig
from wattproof.core.signal import Capture, Samples, Sweep, Tone
from wattproof.core.units import from_db
from wattproof.core.wording import sentence
from wattproof.dsp.loop import Densities, Tones, densities, sample_format, tones
from wattproof.dsp.separation import averaged
from wattproof.dsp.sweep import Path, path_of
from wattproof.procedures.level_calibration import Meter, full_scale, meter_reading, propose
from wattproof.procedures.read_recording import read_recording
from wattproof.procedures.requests import (
    Acquire,
    Action,
    Ask,
    Play,
    Procedure,
    Progress,
    Record,
    Request,
    Shown,
    Wishes,
)
from wattproof.procedures.wiring_check import Join, check_joins, check_pad, check_path
from wattproof.signals.sweep import sweep_samples

Answer = int | float | str | Capture | Wishes | None
Result = TypeVar("Result")
Doing = Generator[Request | Record, Answer, Result]

METER = "meter"  # what a Confirm wants whose answer is the AC voltage that the meter shows
SWEEP_FROM_HZ = 5.0  # an octave below the response's first point
MOST_SWEEPS = 5
RESPONSE_FROM_HZ = 10.0
BAND_END = 0.45  # of the rate, where the filters of converters begin
SETTLE_S = 0.3  # couplings of an interface: common practice, no source
WIRING_FS = from_db(-40.0)
HEADROOM_FS = from_db(-1.0)  # the highest peak that a loop puts on an input
LEVELS_DB = (0.0, -6.0, -12.0, -20.0)  # below the top, where harmonics are read
FAINT_DB = (-40.0, -60.0)  # further steps of the linearity
ORDERS = range(2, 6)  # whose harmonics decide on more averaging
TAIL_S = 1.0  # after a sweep: the longest round trip, and what rings


class Step(StrEnum):
    """What a calibration is doing. The values are stable: they are shown and stored."""

    WIRING = "wiring check"
    RESPONSE = "delay and response"
    NOISE = "noise and mains"
    DIRECT = "levels, direct"
    CROSSTALK = "crosstalk"
    METER = "level by the meter"
    PAD = "levels, through the pad"


@attrs.frozen
class CalibratePlan:
    """How a calibration by loopback is done."""

    frequency_hz: float = declared(
        997.0, label="Frequency", unit="Hz", minimum=100.0, maximum=5000.0, help="of the tones"
    )
    highest_fs: float = declared(
        0.5, label="Highest drive", minimum=0.01, maximum=1.0, help="ratio to full scale; above it is extrapolated"
    )
    sweep_s: float = declared(4.0, label="Sweep", unit="s", minimum=1.0, maximum=30.0, help="length of the swept sine")
    block_s: float = declared(1.0, label="Block", unit="s", minimum=0.25, maximum=5.0, help="length of one reading")
    most_blocks: int = declared(
        4, label="Blocks", minimum=1, maximum=64, help="averaged at most until noise is 10 dB below a harmonic"
    )
    pad: bool = declared(
        default=True, label="Pad", help="second pass through a pad of 20 to 30 dB: tells the converters apart"
    )


@attrs.define(eq=False)
class LevelStep:
    """One drive level: what was played, and the readings of each input, by input."""

    level_fs: float
    readings: dict[int, list[Reading]] = attrs.field(factory=dict)


@attrs.define(eq=False)
class Compared:
    """One comparison with the meter: output, what was played, what the meter showed, and the input's reading."""

    join: Join
    level_fs: float
    read_v: float
    reading: Reading


@attrs.define(eq=False)
class Findings:
    """What a calibration has found so far; `procedures.calibration_record.conclude` makes the record of it."""

    joins: tuple[Join, ...]
    rate_hz: float
    plan: CalibratePlan
    step: Step = Step.WIRING
    format: str = ""
    paths: dict[int, Path] = attrs.field(factory=dict)
    silence: dict[int, Reading] = attrs.field(factory=dict)
    quiet: Densities | None = None
    loud: Densities | None = None
    direct: list[LevelStep] = attrs.field(factory=list)
    padded: list[LevelStep] = attrs.field(factory=list)
    crosstalk: dict[int, Tones] = attrs.field(factory=dict)  # by the output that sounds alone
    compared: list[Compared] = attrs.field(factory=list)


def joins_of(rig: Rig) -> tuple[Join, ...]:
    """Return the loops that a rig's channels ask for.

    Raises:
        WrongUseError: two channels share an output.
    """
    joins = tuple(Join(wiring.output, wiring.input) for wiring in rig.wirings)
    if len({join.output for join in joins}) != len(joins):
        raise WrongUseError("two channels of the rig share one output; a calibration joins each output to one input")
    return joins


class Calibrating:
    """One calibration: `steps` is its procedure, `findings` what it has found when that is done."""

    def __init__(
        self, plan: CalibratePlan, joins: Sequence[Join], rate_hz: float, ceiling_fs: float, meter: Meter | None
    ) -> None:
        self.findings = Findings(tuple(joins), rate_hz, plan)
        self._plan, self._rate_hz, self._meter = plan, rate_hz, meter
        self._outputs = tuple(join.output for join in joins)
        self._top_fs = min(plan.highest_fs, ceiling_fs)
        high_hz = min(20_000.0, rate_hz / 2.0)
        self._settings = ReadingSettings(high_hz=high_hz, reference=Reference.FUNDAMENTAL)

    def steps(self) -> Procedure:
        """Do all of it; between the passes a person, or a bench that can, is asked to plug."""
        yield Ask(Action.CONNECT, Connection.DIRECT, self._joins_text())
        yield from self._check_wiring()
        yield from self._sweep()
        yield from self._listen()
        yield from self._climb(self.findings.direct, Step.DIRECT, faint=True)
        yield from self._cross()
        if self._meter is not None:
            yield from self._compare(self._meter)
        if self._plan.pad:
            yield Ask(Action.CONNECT, Connection.PAD, self._joins_text())
            yield from self._climb(self.findings.padded, Step.PAD, faint=False)
        yield Ask(Action.CONNECT, Connection.AMPLIFIER, "")

    def _joins_text(self) -> str:
        return ", ".join(f"{join.output} > {join.input}" for join in self.findings.joins)

    def _begin(self, step: Step) -> Doing[None]:
        self.findings.step = step
        yield Progress(list(Step).index(step) / len(Step), 0.0, note(Kind.CALIBRATING, what=step.value))

    def _check_wiring(self) -> Doing[None]:
        yield from self._begin(Step.WIRING)
        level_fs = min(WIRING_FS, self._top_fs)
        heard = {}
        for output in self._outputs:
            samples = yield from self._sounding(level_fs, (output,), 0.25)
            heard[output] = np.abs(tones(samples, self._rate_hz, self._plan.frequency_hz).amplitudes).tolist()
            self.findings.format = sample_format(samples)
        check_joins(self.findings.joins, heard, level_fs)
        gains = [heard[join.output][join.input - 1] / level_fs for join in self.findings.joins]
        self._top_fs = min(self._top_fs, HEADROOM_FS / max(gains))

    def _sweep(self) -> Doing[None]:
        yield from self._begin(Step.RESPONSE)
        end_hz = BAND_END * self._rate_hz
        # peaks of a sweep are what a tone's are; half of the top leaves room for whatever resonates
        sweep = Sweep(
            SWEEP_FROM_HZ, self._top_fs / 2.0, self._outputs, end_hz=end_hz * 1.05, seconds=self._plan.sweep_s
        )
        samples = yield from self._swept(sweep)
        played = sweep_samples(sweep, self._rate_hz)
        for join in self.findings.joins:
            column = np.ascontiguousarray(samples[:, join.input - 1])
            path = path_of(column, played, self._rate_hz, RESPONSE_FROM_HZ, end_hz)
            check_path(join, inverted=path.inverted, echo=path.echo)
            self.findings.paths[join.input] = path

    def _swept(self, sweep: Sweep) -> Doing[Samples]:
        """Play the sweep until it is captured from its beginning: behind a refused block there is but silence."""
        for _ in range(MOST_SWEEPS):
            yield from self._silence()
            begins = yield Play(sweep)
            assert isinstance(begins, int)  # noqa: S101 - the answer that a Play has by contract
            capture = yield from self._captured(self._plan.sweep_s + TAIL_S, 0.0)
            if capture.first_frame <= begins:
                return capture.samples
        raise WattproofError(
            f"no sweep of {MOST_SWEEPS} came back whole; close what else uses the interface, and calibrate anew"
        )

    def _listen(self) -> Doing[None]:
        yield from self._begin(Step.NOISE)
        yield from self._silence()
        samples = yield from self._samples(2.0 * self._plan.block_s, SETTLE_S)
        readings = read_recording(Capture(samples, self._rate_hz), self._settings)
        self.findings.silence = {reading.channel: reading for reading in readings}
        self.findings.quiet = self._densities(samples, None)

    def _densities(self, samples: Samples, near_hz: float | None) -> Densities:
        return densities(samples, self._rate_hz, near_hz, RESPONSE_FROM_HZ, BAND_END * self._rate_hz)

    def _climb(self, steps: list[LevelStep], step: Step, *, faint: bool) -> Doing[None]:
        """Read every level, the lowest first: what goes wrong is seen while it is quiet."""
        yield from self._begin(step)
        for down_db in sorted(LEVELS_DB + (FAINT_DB if faint else ())):
            at = LevelStep(self._top_fs * from_db(down_db))
            yield from self._average(at, many=down_db in LEVELS_DB)
            steps.append(at)
            if not faint and len(steps) == 1:
                self._check_pads(at)
        steps.reverse()

    def _average(self, at: LevelStep, *, many: bool) -> Doing[None]:
        """Read blocks until noise is 10 dB below each low harmonic, or enough were read."""
        yield Play(Tone(self._plan.frequency_hz, at.level_fs, self._outputs))
        for number in range(self._plan.most_blocks if many else 1):
            samples = yield from self._samples(self._plan.block_s, 0.0 if number else SETTLE_S)
            readings = self._read(samples, self._plan.frequency_hz)
            for join in self.findings.joins:
                at.readings.setdefault(join.input, []).append(_sound(readings[join.input - 1]))
            yield Shown(readings)
            if all(_resolved(told) for told in at.readings.values()):
                break
        if at.level_fs == self._top_fs and self.findings.loud is None:
            self.findings.loud = self._densities(samples, self._plan.frequency_hz)

    def _read(self, samples: Samples, near_hz: float) -> tuple[Reading, ...]:
        """Read every input by itself, hum told from noise by a fit: a live reading leaves some of a strong line."""
        return read_recording(Capture(samples, self._rate_hz), self._settings, fundamental_hz=near_hz)

    def _check_pads(self, at: LevelStep) -> None:
        direct = next(step for step in self.findings.direct if step.level_fs == at.level_fs)
        for join in self.findings.joins:
            check_pad(join, _level(at.readings[join.input]) / _level(direct.readings[join.input]))

    def _cross(self) -> Doing[None]:
        yield from self._begin(Step.CROSSTALK)
        if len(self._outputs) < 2:
            return
        for output in self._outputs:
            samples = yield from self._sounding(self._top_fs, (output,), self._plan.block_s)
            self.findings.crosstalk[output] = tones(samples, self._rate_hz, self._plan.frequency_hz)

    def _compare(self, meter: Meter) -> Doing[None]:
        yield from self._begin(Step.METER)
        proposal = propose(meter)
        for join in self.findings.joins:
            yield Play(Tone(proposal.frequency_hz, self._top_fs, (join.output,)))
            read_v = yield Ask(Action.CONFIRM, METER, f"output {join.output}; {proposal.why}")
            read_v = number_of(read_v)
            expected = self.findings.compared[-1].read_v if self.findings.compared else None
            volts = meter_reading(meter, read_v, expected)
            samples = yield from self._samples(self._plan.block_s, SETTLE_S)
            readings = self._read(samples, proposal.frequency_hz)
            full_scale(readings[join.input - 1], volts, meter)  # what it refuses is told while the cables still are in
            self.findings.compared.append(Compared(join, self._top_fs, read_v, readings[join.input - 1]))

    def _sounding(self, level_fs: float, outputs: tuple[int, ...], seconds: float) -> Doing[Samples]:
        yield Play(Tone(self._plan.frequency_hz, level_fs, outputs))
        return (yield from self._samples(seconds, SETTLE_S))

    def _silence(self) -> Doing[None]:
        yield Play(Tone(self._plan.frequency_hz, 0.0, self._outputs))

    def _samples(self, seconds: float, settle_s: float) -> Doing[Samples]:
        return (yield from self._captured(seconds, settle_s)).samples

    def _captured(self, seconds: float, settle_s: float) -> Doing[Capture]:
        capture = yield Acquire(round(seconds * self._rate_hz), None, settle_s)
        assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
        if capture.gaps:
            raise WattproofError(
                f"frames may be missing ({capture.gaps[0].why}); close what else uses the interface, and calibrate anew"
            )
        if capture.overloads:
            raise WattproofError(
                f"input {capture.overloads[0].channel} is overloaded by the loop; turn its gain down, or drive it less"
            )
        return capture


def _sound(reading: Reading) -> Reading:
    if reading.state is State.OK:
        return reading
    why = "; ".join(sentence(each) for each in reading.notes) or reading.state.value
    raise WattproofError(f"input {reading.channel} could not be read in the loop: {why}")


def _level(readings: Sequence[Reading]) -> float:
    levels = [reading.fundamental_fs.value for reading in readings if reading.fundamental_fs is not None]
    return sum(levels) / len(levels)


def _resolved(readings: Sequence[Reading]) -> bool:
    lines = averaged(readings)
    return all(lines[order].resolved for order in ORDERS if order in lines)


def number_of(answer: Answer) -> float:
    """Return the volts that a person typed.

    Raises:
        WrongUseError: it is no number.
    """
    try:
        return float(str(answer))
    except ValueError as error:
        raise WrongUseError(
            f"meter reading {str(answer)!a} is no number; give the volts that the meter shows, for example 0.998"
        ) from error
