"""Noise and hum at rest: the amplifier's input is terminated, which is asked for and checked by what arrives."""

from collections.abc import Sequence

import attrs

from wattproof.core import checks
from wattproof.core.connection import Connection
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import Part, Quantity, measured
from wattproof.core.reading import Reading
from wattproof.core.signal import Capture, Tone
from wattproof.core.units import db
from wattproof.dsp.correction import limit, without_own_noise
from wattproof.dsp.interface_floor import Levels, own_noise
from wattproof.dsp.quasi_peak import GAUSSIAN_NOISE
from wattproof.dsp.quiet import read_quiet, white_share
from wattproof.dsp.transfer import transfer
from wattproof.dsp.uncertainty import exact, product
from wattproof.procedures.around_plan import REFERENCE_HZ, AroundPlace, AroundPlan
from wattproof.procedures.driving import START_FS, Doing
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.power_switching import FULL, begin
from wattproof.procedures.requests import (
    Acquire,
    Action,
    Ask,
    Figure,
    Kept,
    Mark,
    Play,
    Procedure,
    Progress,
    Role,
    Said,
)
from wattproof.procedures.stepping import Stepping, said_notes
from wattproof.procedures.terminals import full_scale_volts

CHECK_S, CHECK_SETTLE_S = 0.5, 0.2
SETTLE_S = 0.5
HEARD = 6.0  # times its own noise: a line that noise alone reaches by chance e^−18
_ONE_WATT = 1.0


@attrs.frozen(kw_only=True)
class IdlePlan(AroundPlan):
    """Settings of `idle`."""

    seconds: float = declared(
        5.0, label="Length", unit="s", minimum=2.0, maximum=30.0, help="how long is listened; the meter settles in 1 s"
    )
    output_vrms: float | None = declared(
        None,
        label="Stated output",
        unit="V rms",
        help="output that noise is also stated below, as the rated one",
        validator=checks.positive,
    )
    termination_ohm: float | None = declared(
        None, label="Termination", unit="Ω", minimum=0.0, help="what the input is terminated with, for the record"
    )
    passes_dc: bool = declared(default=False, label="DC coupled", help="the interface's inputs pass DC")
    dc_v: str = declared(
        "",
        label="DC offset",
        unit="V",
        help='as a meter shows it at the terminals, channel by channel, as "0.006,-0.011"',
    )

    def __attrs_post_init__(self) -> None:
        super().__attrs_post_init__()
        if self.typed_dc_v and len(self.typed_dc_v) != len(self.guarded().channel_list):
            raise ValueError(f'dc-v is "{self.dc_v}"; give one voltage for each of the channels {self.channels}')

    @property
    def typed_dc_v(self) -> tuple[float, ...]:
        """What the meter showed, in the order of the channels; none where nothing was typed."""
        try:
            return tuple(float(part) for part in self.dc_v.split(",")) if self.dc_v.strip() else ()
        except ValueError as error:
            raise ValueError(f'dc-v is "{self.dc_v}"; give volts, as 0.006,-0.011') from error


def idle(plan: IdlePlan, place: AroundPlace) -> Procedure:
    """Have the input terminated, check that by a faint tone, and listen.

    Raises:
        WrongUseError: no volts are known.
    """
    rows = rows_of(plan.guarded(), place)
    for row in rows:
        full_scale_volts(row.wiring, place.calibration, plan.full_scale_vrms)
    stepping = Stepping(plan, place, rows[0])
    yield from begin(stepping, FULL)
    yield Ask(Action.CONNECT, Connection.TERMINATED, "in silence")
    for row in rows:
        yield Said(_terminated(row, (yield from _heard(place, row))), row.index)
    yield Progress(0.2, plan.seconds, note(Kind.LISTENING, seconds=plan.seconds, what="in silence"))
    capture = yield Acquire(round(plan.seconds * place.rate_hz), None, SETTLE_S)
    assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
    if capture.gaps or capture.overloads:
        raise WrongUseError("frames are missing or the input is overloaded while nothing plays; look at the wiring")
    readings, _ = stepping.taken(capture)
    for row in rows:
        reading = readings[row.wiring.input - 1]
        yield Kept(reading, Mark(Role.STEP, row.index), idle_figures(capture, reading, row))
    yield Ask(Action.CONNECT, Connection.AMPLIFIER, "in silence")


def _heard(place: AroundPlace, row: Row) -> Doing[float | None]:
    """Return how much of a faint tone arrives, to full scale; None where none can be played."""
    if not row.outputs:
        return None
    tone = Tone(REFERENCE_HZ, min(START_FS, *(place.ceilings_fs[output] for output in row.outputs)), row.outputs)
    yield Play(tone)
    capture = yield Acquire(round(CHECK_S * place.rate_hz), None, CHECK_SETTLE_S)
    assert isinstance(capture, Capture)  # noqa: S101 - likewise
    yield Play(Tone(REFERENCE_HZ, 0.0, row.outputs))
    seen = transfer(capture, tone, 0, follow=False)
    gain, u = abs(complex(seen.gain[row.wiring.input - 1])), float(seen.u[row.wiring.input - 1])
    return gain * tone.level_fs if gain > HEARD * u else 0.0


def _terminated(row: Row, heard_fs: float | None) -> Note:
    if heard_fs is None:
        return note(Kind.TERMINATED_STATED, channel=row.channel)
    if heard_fs > 0.0:
        return note(Kind.NOT_TERMINATED, channel=row.channel, db=-db(heard_fs))
    return note(Kind.TERMINATED_SEEN, channel=row.channel)


_LEVELS = ("unweighted", "noise", "hum", "a_weighted", "quasi_peak", "dc_fs")


def idle_figures(capture: Capture, reading: Reading, row: Row) -> tuple[Figure, ...]:
    """Return what a silent capture holds of a row's channel, as figures in full scales: pure."""
    socket = row.wiring.input - 1
    quiet = read_quiet(capture.samples, capture.rate_hz, reading.settings.band_hz)[socket]
    figures = [Figure(name, getattr(quiet, name).value, getattr(quiet, name).u) for name in _LEVELS]
    figures.append(Figure("quasi_peak_highest", quiet.quasi_peak_highest))
    if quiet.mains_hz is not None:
        figures.append(Figure("mains_hz", quiet.mains_hz))
    figures += [Figure("line", line.level_fs.value, line.level_fs.u, line.frequency_hz) for line in quiet.lines]
    return (*figures, *(Figure("density", value, 0.0, hz) for hz, value in quiet.density))


@attrs.frozen
class Line:
    """One line of hum in V rms."""

    frequency_hz: float
    level_vrms: Quantity


@attrs.frozen
class IdleChannel:
    """One channel at rest, in volts at the terminals; a quantity that is `limited_by` something is a limit."""

    row: Row
    unweighted_vrms: Quantity
    noise_vrms: Quantity
    hum_vrms: Quantity
    a_weighted_vrms: Quantity
    quasi_peak_v: Quantity
    quasi_peak_highest_v: float
    mains_hz: float | None
    lines: tuple[Line, ...]
    density: tuple[tuple[float, Quantity], ...]  # Hz, V/√Hz
    dc_v: Quantity | None
    dc_origin: str  # "read", "typed" or ""
    notes: tuple[Note, ...]

    @property
    def one_watt_vrms(self) -> float:
        """Output that puts one watt into the load."""
        return float((_ONE_WATT * self.row.load.ohm) ** 0.5)


@attrs.frozen
class IdleResult:
    """What `idle` found."""

    plan: IdlePlan
    channels: tuple[IdleChannel, ...]
    said: tuple[Note, ...] = ()


def conclude(plan: IdlePlan, place: AroundPlace, records: Sequence[Kept | Said]) -> IdleResult:
    """Return what kept readings and findings amount to."""
    found = []
    for row in rows_of(plan.guarded(), place):
        kept = [each for each in records if isinstance(each, Kept) and each.mark is not None]
        own = next((each for each in kept if each.mark is not None and each.mark.row == row.index), None)
        said = tuple(each.note for each in records if isinstance(each, Said) and each.row == row.index)
        if own is not None:
            found.append(_Concluding(plan, place, row, own).channel(said))
    return IdleResult(plan, tuple(found), said_notes(records))


@attrs.frozen(eq=False)
class _Concluding:
    plan: IdlePlan
    place: AroundPlace
    row: Row
    kept: Kept

    def channel(self, said: tuple[Note, ...]) -> IdleChannel:
        volts = full_scale_volts(self.row.wiring, self.place.calibration, self.plan.full_scale_vrms)
        own, why = self._own()
        dc, origin, dc_note = self._dc(volts)

        def taken(name: str, share: float) -> Quantity:
            seen = self._figure(name)
            cleaned = seen if own is None else without_own_noise(seen, own.scaled(share, "1"))
            return product(cleaned, volts, "V")

        low, high = self.kept.reading.settings.band_hz
        a, itu = white_share(low, high, "a"), white_share(low, high, "itu")
        return IdleChannel(
            row=self.row,
            unweighted_vrms=taken("unweighted", 1.0),
            noise_vrms=taken("noise", 1.0),
            hum_vrms=self._hum(volts),
            a_weighted_vrms=taken("a_weighted", a),
            quasi_peak_v=taken("quasi_peak", itu * GAUSSIAN_NOISE),
            quasi_peak_highest_v=self._figure("quasi_peak_highest").value * volts.value,
            mains_hz=self._figure("mains_hz").value or None,
            lines=tuple(
                Line(each.at_hz, product(measured(each.value, each.u, "1"), volts, "V"))
                for each in self.kept.figures
                if each.name == "line"
            ),
            density=self._density(volts, own, high - low),
            dc_v=dc,
            dc_origin=origin,
            notes=(*said, *why, *dc_note),
        )

    def _figure(self, name: str) -> Quantity:
        found = next((each for each in self.kept.figures if each.name == name), Figure(name, 0.0))
        return measured(found.value, found.u, "1")

    def _own(self) -> tuple[Quantity | None, tuple[Note, ...]]:
        """Return the interface's own noise in the band, to full scale, and what is to be said of it."""
        own = own_noise(self.place.calibration, self.row.wiring, Levels(self._figure("unweighted").value, None))
        if own is None or self.plan.full_scale_vrms is not None:
            return None, (note(Kind.OWN_NOISE_UNKNOWN, channel=self.row.channel),)
        low, high = self.kept.reading.settings.band_hz
        in_band = own.scaled(((high - low) / _CALIBRATED_WIDTH_HZ) ** 0.5, "1")
        return in_band, (note(Kind.OWN_NOISE_WHITE, channel=self.row.channel),)

    def _hum(self, volts: Quantity) -> Quantity:
        hum = self._figure("hum")
        loop = self.place.calibration.loop(self.row.wiring.input)
        own = 0.0 if loop is None else sum(line.ratio.value**2 for line in loop.mains.lines) ** 0.5
        if own and hum.value - 2.0 * hum.u <= 2.0 * own:
            hum = limit(hum, own)
        return product(hum, volts, "V")

    def _density(self, volts: Quantity, own: Quantity | None, width_hz: float) -> tuple[tuple[float, Quantity], ...]:
        found = []
        for each in self.kept.figures:
            if each.name != "density" or each.value <= 0.0:
                continue
            bins = max(2.0 * 0.029 * each.at_hz, 4.0 / self.plan.seconds) * self.plan.seconds
            seen = measured(each.value, 0.72 * each.value / bins**0.5, "1")  # of a median of so many bins
            if own is not None:
                seen = without_own_noise(seen, own.scaled(width_hz**-0.5, "1"))
            found.append((each.at_hz, product(seen, volts, "V/√Hz")))
        return tuple(found)

    def _dc(self, volts: Quantity) -> tuple[Quantity | None, str, tuple[Note, ...]]:
        typed = self.plan.typed_dc_v
        if typed:
            place = self.plan.guarded().channel_list.index(self.row.channel)
            return exact(typed[place], "V"), "typed", (note(Kind.DC_TYPED),)
        if not self.plan.passes_dc:
            return None, "", (note(Kind.DC_NOT_PASSED),)
        seen = self._figure("dc_fs")
        peak = volts.scaled(2.0**0.5, "V")
        return product(Quantity(seen.value, "1", (Part("offset scatter", seen.u),)), peak, "V"), "read", ()


_CALIBRATED_WIDTH_HZ = 20_000.0 - 20.0
