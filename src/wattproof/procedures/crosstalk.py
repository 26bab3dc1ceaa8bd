"""Crosstalk both ways against frequency, read selectively: the tone alone is fitted in the undriven channel."""

from collections.abc import Sequence

import attrs

from wattproof.core import checks
from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import STATISTICS, Part, Quantity, measured
from wattproof.core.wording import sentence
from wattproof.dsp.correction import in_reach, limit
from wattproof.dsp.intervals import arcsine
from wattproof.dsp.sources import FLOOR, INTERFACE, NOISE
from wattproof.dsp.uncertainty import named_scatter, product, ratio
from wattproof.procedures.around_plan import AroundPlace, AroundPlan, frequencies
from wattproof.procedures.driving import Muted
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.power_switching import FULL, begin
from wattproof.procedures.requests import Action, Ask, Kept, Mark, Procedure, Role, Said
from wattproof.procedures.stepping import Stepping, bursts_said, gain_of, in_bursts, said_notes
from wattproof.procedures.terminals import full_scale_volts

UNDRIVEN = "terminated undriven"  # what a CONNECT wants: the input of the channel that is not driven
BAND_END = 0.45
CLEAR_HZ = 4.0
SEEN = 3.0  # times the noise of the line, in one quadrature: what noise alone passes by chance e^−4.5


@attrs.frozen(kw_only=True)
class CrosstalkPlan(AroundPlan):
    """Settings of `crosstalk`."""

    level_vrms: float = declared(
        2.0, label="Level", unit="V rms", help="output of the driven channel at 997 Hz", validator=checks.positive
    )
    from_hz: float = declared(100.0, label="From", unit="Hz", minimum=10.0, maximum=5_000.0, help="lowest tone")
    to_hz: float = declared(20_000.0, label="To", unit="Hz", minimum=1_500.0, maximum=80_000.0, help="highest tone")
    per_octave: float = declared(1.0, label="Steps", unit="an octave", minimum=0.2, maximum=12.0, help="tones")
    read_s: float = declared(1.0, label="Reading", unit="s", minimum=0.1, maximum=10.0, help="of each tone")

    def __attrs_post_init__(self) -> None:
        super().__attrs_post_init__()
        if len(self.guarded().channel_list) != 2:
            raise ValueError(f'channels is "{self.channels}"; crosstalk needs two, as 1,2')

    def tones_hz(self, rate_hz: float) -> tuple[float, ...]:
        """Return the tones, those in bursts last, each clear of the mains."""
        tones = frequencies(self.from_hz, min(self.to_hz, BAND_END * rate_hz), self.per_octave, CLEAR_HZ)
        return tuple(sorted(tones, key=lambda hz: (in_bursts(hz), hz)))


def crosstalk(plan: CrosstalkPlan, place: AroundPlace) -> Procedure:
    """Drive one channel, the other's input terminated, and read both at each tone; then the other way round.

    Raises:
        WrongUseError: no volts are known, or both channels share a wiring.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan.guarded(), place)
    if len({row.wiring.input for row in rows}) < 2 or len({row.wiring.output for row in rows}) < 2:
        raise WrongUseError("the rig wires one channel; crosstalk needs an output and an input for each of two")
    stepping = Stepping(plan, place, rows[0])
    yield from begin(stepping, FULL)
    tones_hz = plan.tones_hz(place.rate_hz)
    yield from bursts_said(tones_hz, rows[0])
    try:
        for way, row in enumerate(rows):
            yield from stepping.hushed()
            other = next(each for each in rows if each.channel != row.channel)
            yield Ask(Action.CONNECT, UNDRIVEN, f"channel {other.channel}")
            yield Said(note(Kind.UNDRIVEN_TERMINATED, channel=other.channel), row.index)
            stepping.take_row(row)
            yield from stepping.reach(plan.level_vrms)
            level_fs = stepping.level_fs
            for number, tone_hz in enumerate(tones_hz, way * len(tones_hz)):
                stepping.tune(tone_hz)
                yield stepping.doing(number, 2 * len(tones_hz), f"from channel {row.channel}", 0.0)
                yield from stepping.point(level_fs, plan.read_s, Mark(Role.STEP))
    except Muted as muted:
        yield Said(muted.why, stepping.row.index)
        raise StoppedError(sentence(muted.why)) from muted
    yield from stepping.silence()


@attrs.frozen
class CrosstalkPoint:
    """One tone: volts of the channel that is not driven over those of the driven one (plain ratio)."""

    frequency_hz: float
    ratio: Quantity


@attrs.frozen
class CrosstalkWay:
    """From one channel into the other, by rising frequency."""

    driven: Row
    into: Row
    points: tuple[CrosstalkPoint, ...]
    notes: tuple[Note, ...]


@attrs.frozen
class CrosstalkResult:
    """What `crosstalk` found."""

    plan: CrosstalkPlan
    ways: tuple[CrosstalkWay, ...]
    said: tuple[Note, ...] = ()


def conclude(plan: CrosstalkPlan, place: AroundPlace, records: Sequence[Kept | Said]) -> CrosstalkResult:
    """Return what kept readings and findings amount to."""
    rows = rows_of(plan.guarded(), place)
    ways = []
    for row in rows:
        other = next((each for each in rows if each.channel != row.channel), None)
        own = [
            each for each in records if isinstance(each, Kept) and each.mark is not None and each.mark.row == row.index
        ]
        if other is None or not own:
            continue
        points = sorted((_point(plan, place, row, other, kept) for kept in own), key=lambda point: point.frequency_hz)
        said = tuple(each.note for each in records if isinstance(each, Said) and each.row == row.index)
        ways.append(CrosstalkWay(row, other, tuple(points), (*said, *_notes(place, row, other, points))))
    return CrosstalkResult(plan, tuple(ways), said_notes(records))


def _point(plan: CrosstalkPlan, place: AroundPlace, row: Row, other: Row, kept: Kept) -> CrosstalkPoint:
    driven, into = gain_of(kept, row.wiring.input), gain_of(kept, other.wiring.input)
    assert driven is not None  # noqa: S101 - every kept reading of this procedure holds all inputs
    assert into is not None  # noqa: S101 - likewise

    def volts(size: float, u: float, of: Row) -> Quantity:
        scale = full_scale_volts(
            of.wiring, place.calibration, plan.full_scale_vrms, driven.frequency_hz if driven else 0.0
        )
        return product(named_scatter(measured(size, u, "1"), f"channel {of.channel}"), scale, "V")

    seen = ratio(volts(abs(into.z), into.u, other), volts(abs(driven.z), driven.u, row))
    scatter = into.u / abs(driven.z)
    if abs(into.z) < SEEN * into.u:
        bare = Quantity(seen.value, "1", (Part(STATISTICS, scatter),))
        return CrosstalkPoint(driven.frequency_hz, limit(bare, _own(place, other), NOISE))
    own = _own(place, other)
    if own and in_reach(seen, own):
        return CrosstalkPoint(driven.frequency_hz, limit(seen, own, INTERFACE))
    if own:
        seen = attrs.evolve(seen, parts=(*seen.parts, Part(f"{FLOOR} crosstalk", arcsine(own))))
    return CrosstalkPoint(driven.frequency_hz, seen)


def _own(place: AroundPlace, into: Row) -> float:
    """Return the interface's own crosstalk into an input, as its loop showed it at one frequency; 0 where unknown."""
    loop = place.calibration.loop(into.wiring.input)
    return 0.0 if loop is None or loop.crosstalk is None else loop.crosstalk.value + 2.0 * loop.crosstalk.u


def _notes(place: AroundPlace, row: Row, other: Row, points: Sequence[CrosstalkPoint]) -> list[Note]:
    found = [note(Kind.SHARED_GROUND)]
    loop = place.calibration.loop(other.wiring.input)
    if loop is None or loop.crosstalk is None:
        found.append(note(Kind.CROSSTALK_OWN_UNKNOWN))
    hidden = next((point for point in points if point.ratio.limited_by is not None), None)
    if hidden is not None:
        why = f"the {hidden.ratio.limited_by}"
        found.append(
            note(Kind.CROSSTALK_LIMIT, channel=row.channel, frequency_hz=hidden.frequency_hz, why=why),
        )
    return found
