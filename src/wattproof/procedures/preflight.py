"""The look at a device before the first tone: is it silent, does it really capture, how far away, how honest its rate.

It sounds a soft sweep and two soft tones on one output at a time. What they find out is said by `conclude`, as notes;
whether to go on is for a person.
"""

import math
from collections.abc import Generator
from typing import TypeVar

import attrs
import numpy as np

from wattproof.core.errors import WrongUseError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.signal import Capture, Samples, Sweep, Tone
from wattproof.core.units import db
from wattproof.dsp.arrivals import arrivals
from wattproof.dsp.loop import tones
from wattproof.dsp.sample_format import SampleFormat, best_possible_db, sample_format, unused_low_bits
from wattproof.procedures.requests import Acquire, Play, Procedure, Record, Request, Wishes
from wattproof.procedures.wiring_check import Join
from wattproof.signals.sweep import sweep_samples

Answer = int | float | str | Capture | Wishes | None
Result = TypeVar("Result")
Doing = Generator[Request | Record, Answer, Result]

TONE_HZ = 997.0
NEAR_HALF = 0.47  # of the rate: 22.6 kHz at 48 kHz is above what 44.1 kHz can carry
SWEEP_FROM_HZ, SWEEP_TO = 50.0, 0.4  # of the rate
TAIL_S = 0.5  # after a sweep: the longest round trip
SETTLE_S = 0.3  # couplings of an interface: common practice, no source
LOUD_FS = 10.0 ** (-60.0 / 20.0)  # common practice, no source: interfaces in silence are below −80 dBFS
HEARD = 1.0  # of the noise: a sweep of half a second then stands 40 dB and more over it
SECOND = 0.03  # −30 dB: what an amplifier and its load give back later than 3 ms is far below
BACK = 10.0 ** (-30.0 / 20.0)  # a converter's filter near half the rate costs less, a resampler's more
SAME_CLOCK_PPM = 0.05  # less than two crystals ever agree for long: common practice, no source
COVERAGE = 1.96  # 95 %


@attrs.frozen
class PreflightPlan:
    """How a device is looked at."""

    level_fs: float = declared(
        0.003, label="Level", unit="of full scale", minimum=1e-4, maximum=0.1, help="of sweep and tones: -50 dBFS"
    )
    listen_s: float = declared(0.5, label="Listen", unit="s", minimum=0.1, maximum=10.0, help="in silence")
    sweep_s: float = declared(0.5, label="Sweep", unit="s", minimum=0.2, maximum=5.0, help="length of the swept sine")
    tone_s: float = declared(1.0, label="Tone", unit="s", minimum=0.5, maximum=20.0, help="that tells the clocks apart")


@attrs.frozen
class Silence:
    """What one input gave while nothing was played."""

    input: int
    rms_fs: float  # rms to a full-scale sine, the mean taken off
    zeros: bool
    line_hz: float
    form: SampleFormat


@attrs.frozen
class Way:
    """What came back of one output at its input; the rest is None where that was too little to be looked at."""

    join: Join
    level_fs: float
    delay_frames: int | None = None
    second: float = 0.0  # a second arrival, as a share of the first
    near_hz: float = 0.0
    near: float = 1.0  # level near half the rate, to that of TONE_HZ
    ppm: float = 0.0
    u_ppm: float = 0.0


@attrs.define(eq=False)
class Findings:
    """What was found so far; `conclude` puts it into notes."""

    rate_hz: float
    silence: list[Silence] = attrs.field(factory=list)
    ways: list[Way] = attrs.field(factory=list)


@attrs.frozen
class Verdict:
    """What a look at a device amounts to: `warnings` to be seen to before the first tone, `facts` good to know."""

    warnings: tuple[Note, ...]
    facts: tuple[Note, ...]


def preflight(plan: PreflightPlan, joins: tuple[Join, ...], rate_hz: float, findings: Findings) -> Procedure:
    """Listen, then sound a sweep and two tones over each join, and put what was found into `findings`.

    Raises:
        WrongUseError: no join, or the level is above the drive limit (raised by whoever plays it).
    """
    if not joins:
        raise WrongUseError("no output is joined to an input; name one of each")
    outputs = tuple(sorted({join.output for join in joins}))
    yield Play(Tone(TONE_HZ, 0.0, outputs))
    samples = yield from _samples(plan.listen_s, SETTLE_S, rate_hz)
    findings.silence = [_silence(samples[:, at], at + 1, rate_hz) for at in range(samples.shape[1])]
    for join in joins:
        if findings.silence[join.input - 1].rms_fs > LOUD_FS:  # that comes first
            continue
        findings.ways.append((yield from _way(plan, join, rate_hz, findings.silence[join.input - 1])))
    yield Play(Tone(TONE_HZ, 0.0, outputs))


def conclude(findings: Findings) -> Verdict:
    """Return what the findings amount to."""
    warnings: list[Note] = []
    facts: list[Note] = []
    heard = {way.join.input for way in findings.ways if way.delay_frames is not None}
    for silence in findings.silence:
        if silence.zeros:
            digital = silence.input in heard
            kind = facts if digital else warnings
            kind.append(
                note(Kind.DIGITAL, input=silence.input) if digital else note(Kind.INPUT_ZEROS, input=silence.input)
            )
        else:
            _judge_silence(silence, warnings, facts)
    for way in findings.ways:
        _judge_way(way, findings.rate_hz, warnings, facts)
    return Verdict(tuple(warnings), tuple(facts))


def _samples(seconds: float, settle_s: float, rate_hz: float) -> Doing[Samples]:
    capture = yield Acquire(round(seconds * rate_hz), None, settle_s)
    assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
    return capture.samples


def _silence(samples: Samples, at_input: int, rate_hz: float) -> Silence:
    still = samples - samples.mean()
    rms_fs = math.sqrt(2.0 * float(still @ still) / still.size)
    zeros = not samples.any()
    line_hz = 0.0 if zeros else _strongest_hz(still, rate_hz)
    return Silence(at_input, rms_fs, zeros, line_hz, sample_format(samples))


def _strongest_hz(still: Samples, rate_hz: float) -> float:
    lines = np.abs(np.fft.rfft(still * np.hanning(still.size)))
    return float(np.argmax(lines)) * rate_hz / still.size


def _way(plan: PreflightPlan, join: Join, rate_hz: float, silence: Silence) -> Doing[Way]:
    sweep = Sweep(SWEEP_FROM_HZ, plan.level_fs, (join.output,), end_hz=SWEEP_TO * rate_hz, seconds=plan.sweep_s)
    yield Play(Tone(TONE_HZ, 0.0, (join.output,)))
    yield Play(sweep)
    answer = (yield from _samples(plan.sweep_s + TAIL_S, 0.0, rate_hz))[:, join.input - 1]
    still = answer - answer.mean()
    heard = math.sqrt(2.0 * float(still @ still) / (plan.sweep_s * rate_hz))
    if heard < (1.0 + HEARD) * silence.rms_fs or heard == 0.0:
        return Way(join, plan.level_fs)
    came = arrivals(np.ascontiguousarray(still), sweep_samples(sweep, rate_hz), rate_hz)
    level, ppm, u_ppm = yield from _tone(plan, join, rate_hz, TONE_HZ, plan.tone_s)
    near_hz = NEAR_HALF * rate_hz
    near, *_ = yield from _tone(plan, join, rate_hz, near_hz, 0.25)
    return Way(join, plan.level_fs, came.first_frame, came.second, near_hz, near / level, ppm, u_ppm)


def _tone(
    plan: PreflightPlan, join: Join, rate_hz: float, frequency_hz: float, seconds: float
) -> Doing[tuple[float, float, float]]:
    """Return the level, and how far the frequency is from what was sent, with its standard uncertainty, in ppm."""
    yield Play(Tone(frequency_hz, plan.level_fs, (join.output,)))
    samples = yield from _samples(seconds, SETTLE_S, rate_hz)
    found = tones(samples[:, join.input - 1 : join.input], rate_hz, frequency_hz)
    level = float(abs(found.amplitudes[0]))
    # phase over time is a straight line: u of its slope (Rife & Boorstyn, IEEE Trans. IT-20, 1974, no. 5)
    u_hz = math.sqrt(3.0) / (math.pi * seconds) * float(found.u[0]) / max(level, 1e-300)
    offset = found.frequency_hz / frequency_hz - 1.0
    return level, offset * 1e6, u_hz / frequency_hz * 1e6


def _judge_silence(silence: Silence, warnings: list[Note], facts: list[Note]) -> None:
    floor_db = db(silence.rms_fs)
    if silence.rms_fs > LOUD_FS:
        warnings.append(note(Kind.SOMETHING_PLAYS, input=silence.input, db=floor_db, frequency_hz=silence.line_hz))
    else:
        facts.append(note(Kind.NOISE_FLOOR, input=silence.input, db=floor_db))
    best_db, idle = best_possible_db(silence.form), unused_low_bits(silence.form)
    if best_db is not None and idle:
        what = silence.form.name
        warnings.append(note(Kind.BITS_IDLE, input=silence.input, what=what, count=idle, db=best_db))
    elif silence.form.bits != 0:
        facts.append(note(Kind.WORD_LENGTH, input=silence.input, what=silence.form.name))


def _judge_way(way: Way, rate_hz: float, warnings: list[Note], facts: list[Note]) -> None:
    join = way.join
    if way.delay_frames is None:
        warnings.append(note(Kind.NOTHING_BACK, output=join.output, input=join.input, db=db(way.level_fs)))
        return
    facts.append(note(Kind.ROUND_TRIP, ms=way.delay_frames / rate_hz * 1e3, frames=way.delay_frames))
    if way.second > SECOND:
        warnings.append(note(Kind.MONITORING, input=join.input, db=db(way.second)))
    level_db = db(max(way.near, 1e-9))
    if way.near < BACK:
        warnings.append(note(Kind.RESAMPLED, frequency_hz=way.near_hz, db=level_db))
    else:
        facts.append(note(Kind.RATE_HONEST, frequency_hz=way.near_hz, db=level_db))
    within = COVERAGE * way.u_ppm
    if abs(way.ppm) > max(within, SAME_CLOCK_PPM):
        warnings.append(note(Kind.TWO_CLOCKS, ppm=way.ppm))
    else:
        facts.append(note(Kind.ONE_CLOCK, ppm=way.ppm, within=within))
