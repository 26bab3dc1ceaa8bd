"""Gain, input sensitivity, channel balance and polarity, and how both channels track along the control's travel."""

import math
from collections.abc import Sequence

import attrs
import numpy as np

from wattproof.core import checks
from wattproof.core.errors import StoppedError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Reading, State
from wattproof.core.signal import Sweep
from wattproof.core.units import db
from wattproof.core.wording import sentence
from wattproof.dsp.sweep import path_of
from wattproof.dsp.uncertainty import named_scatter, product, ratio
from wattproof.procedures.around_plan import REFERENCE_HZ, AroundPlace, AroundPlan
from wattproof.procedures.driving import Doing, Muted
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.power_switching import FULL, begin
from wattproof.procedures.requests import Action, Ask, Figure, Kept, Mark, Procedure, Role, Said
from wattproof.procedures.response import MOST_SWEPT_W
from wattproof.procedures.stepping import Stepping, gain_of
from wattproof.procedures.terminals import drive_volts, full_scale_volts
from wattproof.signals.sweep import sweep_samples

AT = "at "  # what a TURN wants: "at " and the position
AS_FOUND = "as found"
POLARITY_S, POLARITY_TAIL_S = 1.0, 0.7
POLARITY_FROM_HZ, POLARITY_TO_HZ = 100.0, 8_000.0
MOVED_DB = 3.0  # a control that turned one channel by that much and the other by a fifth of it works on one side
STAYED = 0.2


@attrs.frozen(kw_only=True)
class GainPlan(AroundPlan):
    """Settings of `gain`."""

    level_vrms: float = declared(
        1.0, label="Level", unit="V rms", help="output at the first position", validator=checks.positive
    )
    rated_vrms: float | None = declared(
        None,
        label="Rated output",
        unit="V rms",
        help="output for which the input sensitivity is stated",
        validator=checks.positive,
    )
    positions: str = declared(
        "",
        label="Positions",
        help='of the control, the loudest first, as "0,-10,-20" or "max,12 h,9 h"; empty: as found',
    )
    allowed_db: float = declared(
        1.0,
        label="Allowed difference",
        unit="dB",
        minimum=0.01,
        maximum=20.0,
        help="between channels, before it is said",
    )
    polarity: bool = declared(default=True, label="Polarity", help="tell it by a soft sweep of one second")
    read_s: float = declared(0.5, label="Reading", unit="s", minimum=0.1, maximum=10.0, help="of each channel")

    @property
    def position_list(self) -> tuple[str, ...]:
        """The positions in order."""
        return tuple(part.strip() for part in self.positions.split(",") if part.strip()) or (AS_FOUND,)


def gain(plan: GainPlan, place: AroundPlace) -> Procedure:
    """Set the level at the first position, then read each channel by itself at each position, with the same drive.

    Raises:
        WrongUseError: no volts are known.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan.guarded(), place)
    for row in rows:
        full_scale_volts(row.wiring, place.calibration, plan.full_scale_vrms)
    stepping = Stepping(plan, place, rows[0])
    yield from begin(stepping, FULL)
    try:
        yield from _positions(plan, stepping, rows)
    except Muted as muted:
        yield Said(muted.why, stepping.row.index)
        raise StoppedError(sentence(muted.why)) from muted
    yield from stepping.silence()


def _positions(plan: GainPlan, stepping: Stepping, rows: Sequence[Row]) -> Doing[None]:
    drives: dict[int, float] = {}
    for number, position in enumerate(plan.position_list):
        yield from stepping.hushed()
        if position != AS_FOUND:
            yield Ask(Action.TURN, f"{AT}{position}")
        for row in rows:
            yield from stepping.hushed()
            stepping.take_row(row)
            stepping.tune(REFERENCE_HZ)
            if row.channel not in drives:
                yield from stepping.reach(plan.level_vrms)
                drives[row.channel] = stepping.level_fs
            yield stepping.doing(number + 1, len(plan.position_list) + 1, position, 0.0)
            yield from stepping.point(drives[row.channel], plan.read_s, Mark(Role.STEP, at=position), 0.2)
            if number == 0 and plan.polarity:
                yield from _polarity(plan, stepping, row, drives[row.channel])


def _polarity(plan: GainPlan, stepping: Stepping, row: Row, level_fs: float) -> Doing[None]:
    """Sweep softly and keep which way the first arrival goes; a level too high for a sweep leaves it untold."""
    if plan.level_vrms**2 / row.load.ohm > MOST_SWEPT_W or not row.outputs:
        yield Said(note(Kind.POLARITY_UNKNOWN), row.index)
        return
    sweep = Sweep(POLARITY_FROM_HZ / 2.0, level_fs, row.outputs, end_hz=POLARITY_TO_HZ, seconds=POLARITY_S)
    capture = yield from stepping.sweep(sweep, POLARITY_TAIL_S)
    column = np.ascontiguousarray(capture.samples[:, row.wiring.input - 1])
    path = path_of(
        column, sweep_samples(sweep, capture.rate_hz), capture.rate_hz, POLARITY_FROM_HZ, 0.75 * POLARITY_TO_HZ
    )
    settings = stepping.reader_settings(row.wiring.input)
    reading = Reading(span=capture.span, channel=row.wiring.input, settings=settings, state=State.OK)
    figure = Figure("inverted", float(path.inverted))
    yield Kept(reading, Mark(Role.STEP, row.index, at="polarity", drive_fs=level_fs), (figure,))


@attrs.frozen
class GainAt:
    """One channel at one position: gain as found, in V per V at the interface's output, or None where unknown.

    `from_first` is the gain over that of the first position (plain ratio).
    """

    position: str
    level_fs: Quantity
    gain: Quantity | None
    from_first: Quantity


@attrs.frozen
class GainChannel:
    """One channel. `inverted` is None where the polarity could not be told."""

    row: Row
    at: tuple[GainAt, ...]
    sensitivity_vrms: Quantity | None
    inverted: bool | None


@attrs.frozen
class Balance:
    """The second channel over the first, at one position (plain ratio)."""

    position: str
    ratio: Quantity


@attrs.frozen
class GainResult:
    """What `gain` found."""

    plan: GainPlan
    channels: tuple[GainChannel, ...]
    balance: tuple[Balance, ...]
    notes: tuple[Note, ...]


def conclude(plan: GainPlan, place: AroundPlace, records: Sequence[Kept | Said]) -> GainResult:
    """Return what kept readings and findings amount to."""
    kept = [each for each in records if isinstance(each, Kept) and each.mark is not None]
    said = [each.note for each in records if isinstance(each, Said)]
    channels = []
    for row in rows_of(plan.guarded(), place):
        own = [each for each in kept if each.mark is not None and each.mark.row == row.index]
        if own:
            channels.append(_channel(plan, place, row, own))
    balance = _balance(channels)
    notes = [*said, *_pointed_out(plan, channels, balance)]
    notes += [note(Kind.POLARITY_TURNED, channel=each.row.channel) for each in channels if each.inverted]
    return GainResult(plan, tuple(channels), balance, tuple(dict.fromkeys(notes)))


def _channel(plan: GainPlan, place: AroundPlace, row: Row, own: Sequence[Kept]) -> GainChannel:
    full_scale = full_scale_volts(row.wiring, place.calibration, plan.full_scale_vrms)
    drive = drive_volts(row.wiring, place.calibration)
    found: list[GainAt] = []
    for each in own:
        seen = gain_of(each, row.wiring.input)
        if seen is None or each.mark is None:
            continue
        name = f"channel {row.channel} at {each.mark.at}"
        level = named_scatter(measured(abs(seen.z), seen.u, "1"), name)
        stated = None if drive is None else ratio(product(level, full_scale, "V"), drive, "1")
        first = found[0].level_fs if found else level
        found.append(GainAt(each.mark.at, level, stated, ratio(level, first)))
    top = found[0].gain if found else None
    sensitivity = None
    if top is not None and plan.rated_vrms is not None:
        sensitivity = ratio(Quantity(plan.rated_vrms, "V"), top, "V")
    return GainChannel(row, tuple(found), sensitivity, _inverted(place, row, own))


def _inverted(place: AroundPlace, row: Row, own: Sequence[Kept]) -> bool | None:
    """Return whether the amplifier turns the polarity; an interface that is known to turn it is reckoned with."""
    figure = next((f for each in own for f in each.figures if f.name == "inverted"), None)
    if figure is None:
        return None
    loop = place.calibration.loop(row.wiring.input)
    return bool(figure.value) != (loop is not None and loop.inverted)


def _balance(channels: Sequence[GainChannel]) -> tuple[Balance, ...]:
    if len(channels) != 2:
        return ()
    first, second = channels
    found = []
    for one, two in zip(first.at, second.at, strict=False):
        both = one.gain is not None and two.gain is not None
        over, under = (two.gain, one.gain) if both else (two.level_fs, one.level_fs)
        if over is not None and under is not None:
            found.append(Balance(one.position, ratio(over, under)))
    return tuple(found)


def _pointed_out(plan: GainPlan, channels: Sequence[GainChannel], balance: Sequence[Balance]) -> list[Note]:
    found = []
    alone = _alone(channels)
    if alone is not None:
        found.append(alone)
    for each in balance:
        apart_db = abs(db(each.ratio.value))
        if apart_db > plan.allowed_db:
            found.append(note(Kind.CHANNELS_DIFFER, db=apart_db, named=each.position, allowed_db=plan.allowed_db))
    return found


def _alone(channels: Sequence[GainChannel]) -> Note | None:
    """Return the note of a control that moves one channel and not the other, or None."""
    if len(channels) != 2:
        return None
    moves = [[db(each.from_first.value) for each in channel.at] for channel in channels]
    for one, two in zip(*(map(abs, each) for each in moves), strict=False):
        for moved, stayed, name, other in ((one, two, 0, 1), (two, one, 1, 0)):
            if math.isfinite(moved) and moved > MOVED_DB and stayed < STAYED * moved:
                names = [channel.row.wiring.name or str(channel.row.channel) for channel in channels]
                return note(Kind.CHANNEL_ALONE, what=names[name], db=moved, named=names[other], other_db=stayed)
    return None
