"""Level and phase against frequency at a stated level: by stepped tones, by a swept sine, or by both.

Stepped tones are exact at every point; a sweep shows the whole curve and tells distortion by order. The drive stands as
it gave the stated level at 997 Hz. Tone controls are shown against their flat setting, read just before.
"""

from collections.abc import Sequence
from enum import StrEnum

import attrs
import numpy as np

from wattproof.core import checks
from wattproof.core.connection import Connection
from wattproof.core.errors import StoppedError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, note
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, State
from wattproof.core.signal import Capture, Sweep
from wattproof.core.units import from_db
from wattproof.core.wording import sentence
from wattproof.dsp.sweep import path_of
from wattproof.dsp.sweep_orders import orders_of
from wattproof.procedures.around_plan import REFERENCE_HZ, AroundPlace, AroundPlan, frequencies
from wattproof.procedures.driving import Doing, Muted
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.power_switching import FULL, begin, switch
from wattproof.procedures.requests import Action, Ask, Figure, Kept, Mark, Procedure, Role, Said
from wattproof.procedures.stepping import Stepping, bursts_said, gain_of, in_bursts
from wattproof.procedures.still_the_same import against_loop, refuse_moved
from wattproof.signals.sweep import sweep_samples

FLAT, SET, LOOP = "flat", "as set", "loop"  # the passes; the first two are what a TURN wants as well
LOOP_FS = from_db(-20.0)
MOST_SWEPT_W = 2.5  # a sweep stays above 5 kHz for two seconds, four bursts long: our own bound, common practice
SWEEP_TAIL_S = 1.0
SWEEP_BEGINS = 0.5  # of the lowest frequency: an octave for the excitation to stand
BAND_END = 0.45  # of the rate, where the filters of converters begin
ORDERS = 5


class Method(StrEnum):
    """How a response is read."""

    STEPPED = "stepped"
    SWEEP = "sweep"
    BOTH = "both"


@attrs.frozen(kw_only=True)
class ResponsePlan(AroundPlan):
    """Settings of `response`."""

    level_vrms: float = declared(
        2.0, label="Level", unit="V rms", help="output at 997 Hz at which it is read", validator=checks.positive
    )
    from_hz: float = declared(10.0, label="From", unit="Hz", minimum=10.0, maximum=5_000.0, help="lowest tone")
    to_hz: float = declared(20_000.0, label="To", unit="Hz", minimum=1_500.0, maximum=80_000.0, help="highest tone")
    per_octave: float = declared(3.0, label="Steps", unit="an octave", minimum=0.2, maximum=24.0, help="stepped tones")
    method: Method = declared(
        Method.STEPPED, label="Method", help="stepped tones, a swept sine with distortion by order, or both"
    )
    read_s: float = declared(0.25, label="Reading", unit="s", minimum=0.1, maximum=5.0, help="of each stepped tone")
    sweep_s: float = declared(10.0, label="Sweep", unit="s", minimum=1.0, maximum=30.0, help="length of the swept sine")
    relative: bool = declared(
        default=False, label="Against flat", help="read tone controls, filters or loudness flat first, then as set"
    )
    listening_w: float | None = declared(
        None,
        label="Listening level",
        unit="W",
        help="power without a lift, for what the lift asks for; the stated level without it",
        validator=checks.positive,
    )
    loop: bool = declared(
        default=False, label="Loop first", help="read the interface itself in a loop first, and take it out"
    )

    def __attrs_post_init__(self) -> None:
        super().__attrs_post_init__()
        if self.from_hz * 2.0 > self.to_hz:
            raise ValueError(f"{self.from_hz:g} to {self.to_hz:g} Hz is less than an octave; widen it")

    def tones_hz(self, rate_hz: float) -> tuple[float, ...]:
        """Return the stepped tones; a sweep alone has one an octave, which guard it."""
        density = 1.0 if self.method is Method.SWEEP else self.per_octave
        return frequencies(self.from_hz, min(self.to_hz, BAND_END * rate_hz), density)


def response(plan: ResponsePlan, place: AroundPlace) -> Procedure:
    """Set the level, then go through the tones, and through the passes, for each load and channel.

    Raises:
        WrongUseError: no volts are known, or the gain has moved since the calibration.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan.guarded(), place)
    stepping = Stepping(plan, place, rows[0])
    run = _Run(plan, place, stepping)
    yield from begin(stepping, FULL)
    yield from bursts_said(plan.tones_hz(place.rate_hz), rows[0])
    if plan.loop:
        yield from run.loops(rows)
    load_in_ohm = place.rig.wirings[0].load.nominal_ohm
    for row in rows:
        yield from switch(stepping, row, load_in_ohm)
        load_in_ohm = row.load.nominal_ohm
        try:
            yield from run.row()
        except Muted as muted:
            yield Said(muted.why, row.index)
            if muted.final:
                raise StoppedError(sentence(muted.why)) from muted
    yield from stepping.silence()


@attrs.define(eq=False)
class _Run:
    plan: ResponsePlan
    place: AroundPlace
    stepping: Stepping
    done: int = 0
    tallest: float = 1.0  # largest gain over that at the reference, of the pass under way

    def loops(self, rows: Sequence[Row]) -> Doing[None]:
        """Read each channel's own loop, before the amplifier is in the way."""
        yield Ask(Action.CONNECT, Connection.DIRECT, ", ".join(f"{r.wiring.output} > {r.wiring.input}" for r in rows))
        self.stepping.free = True
        for row in {row.wiring.input: row for row in rows}.values():
            self.stepping.take_row(row)
            level_fs = min(LOOP_FS, self.stepping.ceiling_fs)
            yield from self._pass(LOOP, level_fs)
            yield from self.stepping.silence()
        self.stepping.free = False
        yield Ask(Action.CONNECT, Connection.AMPLIFIER, "in silence")
        yield from self.stepping.hushed()

    def row(self) -> Doing[None]:
        if self.plan.relative:
            yield from self.stepping.hushed()
            yield Ask(Action.TURN, FLAT)
        yield from self.stepping.reach(self.plan.level_vrms)
        level_fs = self.stepping.level_fs
        if self.plan.relative:
            yield from self._pass(FLAT, level_fs)
            yield from self.stepping.hushed()
            yield Ask(Action.TURN, SET)
        yield from self._pass(SET, level_fs)
        yield from self.stepping.silence()

    def _pass(self, name: str, level_fs: float) -> Doing[None]:
        tones_hz = sorted(self.plan.tones_hz(self.place.rate_hz), key=lambda hz: (in_bursts(hz), hz))
        reference = 0.0
        self.tallest = 1.0
        for tone_hz in (REFERENCE_HZ, *tones_hz):
            self.stepping.tune(tone_hz)
            self.done += 1
            yield self.stepping.doing(self.done, self._whole(len(tones_hz)), name, 0.0)
            kept = yield from self.stepping.point(level_fs, self.plan.read_s, Mark(Role.STEP, at=name))
            gain = gain_of(kept, self.stepping.row.wiring.input)
            height = 0.0 if gain is None else abs(gain.z)
            if name == LOOP and not reference:
                self._same(kept)
            reference = reference or height
            if reference:
                self.tallest = max(self.tallest, height / reference)
        if self.plan.method is not Method.STEPPED:
            yield from self._sweep(name, level_fs)

    def _whole(self, tones: int) -> int:
        rows = len(rows_of(self.plan.guarded(), self.place))
        passes = rows * (2 if self.plan.relative else 1) + (rows if self.plan.loop else 0)
        return max(passes * (tones + 1), self.done)

    def _same(self, kept: Kept) -> None:
        """Refuse a loop whose gain is not the calibrated one any more, as far as a loop can tell."""
        socket = self.stepping.row.wiring.input
        loop, gain = self.place.calibration.loop(socket), gain_of(kept, socket)
        if loop is not None and gain is not None:
            refuse_moved(against_loop(measured(abs(gain.z), gain.u, "1"), loop.gain), kept.reading)

    def _sweep(self, name: str, level_fs: float) -> Doing[None]:
        row = self.stepping.row
        power_w = (self.plan.level_vrms * self.tallest) ** 2 / row.load.ohm
        if name != LOOP and power_w > MOST_SWEPT_W:
            yield Said(note(Kind.SWEEP_TOO_LOUD, most_w=MOST_SWEPT_W, power_w=power_w), row.index)
            return
        end_hz = min(self.plan.to_hz * 1.05, BAND_END * 1.05 * self.place.rate_hz)
        sweep = Sweep(SWEEP_BEGINS * self.plan.from_hz, level_fs, row.outputs, end_hz=end_hz, seconds=self.plan.sweep_s)
        self.stepping.tune(REFERENCE_HZ)
        capture = yield from self.stepping.sweep(sweep, SWEEP_TAIL_S)
        mark = Mark(Role.STEP, row.index, at=f"{name} sweep", drive_fs=sweep.level_fs)
        socket = row.wiring.input
        reading = Reading(
            span=capture.span, channel=socket, settings=self.stepping.reader_settings(socket), state=State.OK
        )
        yield Kept(reading, mark, sweep_figures(capture, sweep, socket, self.plan))


def sweep_figures(capture: Capture, sweep: Sweep, socket: int, plan: ResponsePlan) -> tuple[Figure, ...]:
    """Return the gain and the orders that a sweep tells of one input, as figures: pure, from the capture alone."""
    played = sweep_samples(sweep, capture.rate_hz)
    column = np.ascontiguousarray(capture.samples[:, socket - 1])
    end_hz = min(plan.to_hz, BAND_END * capture.rate_hz)
    path = path_of(column, played, capture.rate_hz, plan.from_hz, end_hz)
    figures = [Figure("delay_frames", path.delay_frames)]
    for hz, gain, u in zip(path.frequency_hz.tolist(), path.gain.tolist(), path.u.tolist(), strict=True):
        figures += [Figure(f"re {socket}", gain.real, u, hz), Figure(f"im {socket}", gain.imag, u, hz)]
    told = orders_of(column, played, sweep, capture.rate_hz, path.delay_frames, path.frequency_hz, ORDERS)
    for each in told:
        rows = zip(each.frequency_hz.tolist(), each.ratio.tolist(), each.noise.tolist(), strict=True)
        figures += [Figure(f"order {each.order}", ratio, noise, hz) for hz, ratio, noise in rows]
    return tuple(figures)
