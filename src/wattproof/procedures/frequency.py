"""THD+N against frequency at constant output voltage: the drive is steered at each tone."""

import math
from collections.abc import Sequence

import attrs

from wattproof.core import checks
from wattproof.core.errors import StoppedError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import Part, Quantity
from wattproof.core.wording import sentence
from wattproof.dsp.intervals import rectangular
from wattproof.procedures.around_plan import AroundPlace, AroundPlan, frequencies
from wattproof.procedures.driving import Doing, Muted
from wattproof.procedures.power_plan import BURST_BELOW_HZ
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.power_switching import FULL, begin, switch
from wattproof.procedures.requests import Kept, Mark, Procedure, Role, Said
from wattproof.procedures.stepping import RAISE, Stepping, bursts_said, in_bursts, said_notes

STEERS = 5
BAND_END = 0.45  # of the rate
SETTLING = 5e-4  # of the level, below 40 Hz: our own measurement with a coupling at 2 Hz
INSIDE = 1.002  # a tone on the band's edge counts or not by a hair: the lowest stands so far above it
_EDGE = 1.0 + 1e-6  # a harmonic on the band's edge is inside


@attrs.frozen(kw_only=True)
class FrequencyPlan(AroundPlan):
    """Settings of `frequency`."""

    level_vrms: float = declared(
        2.0, label="Output", unit="V rms", help="output voltage that is kept at every tone", validator=checks.positive
    )
    from_hz: float = declared(20.0, label="From", unit="Hz", minimum=10.0, maximum=5_000.0, help="lowest tone")
    to_hz: float = declared(20_000.0, label="To", unit="Hz", minimum=1_500.0, maximum=80_000.0, help="highest tone")
    per_octave: float = declared(3.0, label="Steps", unit="an octave", minimum=0.2, maximum=24.0, help="tones")
    read_s: float = declared(0.5, label="Reading", unit="s", minimum=0.1, maximum=5.0, help="of each tone")
    within: float = declared(
        0.005, label="Kept within", unit="1", minimum=0.001, maximum=0.1, help="of the output, as a plain ratio"
    )

    def __attrs_post_init__(self) -> None:
        super().__attrs_post_init__()
        if not self.low_hz <= self.from_hz < self.to_hz:
            raise ValueError(
                f"tones from {self.from_hz:g} to {self.to_hz:g} Hz: they must rise and begin inside the band, which "
                f"begins at {self.low_hz:g} Hz"
            )

    def tones_hz(self, rate_hz: float) -> tuple[float, ...]:
        """Return the tones, by rising frequency, none beyond the band."""
        lowest_hz = max(self.from_hz, INSIDE * self.low_hz)
        return frequencies(lowest_hz, min(self.to_hz, self.high_hz, BAND_END * rate_hz), self.per_octave)


def frequency(plan: FrequencyPlan, place: AroundPlace) -> Procedure:
    """Go through the tones of each load and channel, the ones in bursts last, and steer the drive at each.

    Raises:
        WrongUseError: no volts are known.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan.guarded(), place)
    tones_hz = sorted(plan.tones_hz(place.rate_hz), key=lambda hz: (in_bursts(hz), hz))
    stepping = Stepping(plan, place, rows[0])
    yield from begin(stepping, FULL)
    yield from bursts_said(tuple(tones_hz), rows[0])
    load_in_ohm, done = place.rig.wirings[0].load.nominal_ohm, 0
    for row in rows:
        yield from switch(stepping, row, load_in_ohm)
        load_in_ohm = row.load.nominal_ohm
        try:
            yield from stepping.reach(plan.level_vrms)
            level_fs = stepping.level_fs
            for tone_hz in tones_hz:
                stepping.tune(tone_hz)
                done += 1
                yield stepping.doing(done, len(rows) * len(tones_hz), "THD+N", 0.0)
                level_fs = yield from _steered(plan, stepping, level_fs)
        except Muted as muted:
            yield Said(muted.why, row.index)
            if muted.final:
                raise StoppedError(sentence(muted.why)) from muted
    yield from stepping.silence()


def _steered(plan: FrequencyPlan, stepping: Stepping, level_fs: float) -> Doing[float]:
    """Read at a tone until the output stands where it shall; return the drive that does it. The last reading counts."""
    for _ in range(STEERS):
        kept = yield from stepping.point(level_fs, plan.read_s, Mark(Role.STEP, at="steered"))
        volts = kept.reading.level_vrms
        ratio = plan.level_vrms / volts.value if volts is not None and volts.value else 1.0
        if abs(ratio - 1.0) <= plan.within or (ratio > 1.0 and level_fs >= stepping.ceiling_fs):
            break
        level_fs = min(level_fs * min(ratio, RAISE), stepping.ceiling_fs)
    return level_fs


@attrs.frozen
class FrequencyPoint:
    """One tone. `harmonics_inside` counts the harmonics in the band; with none THD+N and THD are not stated."""

    frequency_hz: float
    level_vrms: Quantity | None
    thdn: Quantity | None
    thd: Quantity | None
    noise: Quantity | None
    harmonics_inside: int

    @property
    def remark(self) -> str:
        """What keeps the point from being compared with those of lower tones; empty where nothing does."""
        if self.harmonics_inside == 0:
            return "no harmonic inside the band: not stated"
        if self.harmonics_inside == 1:
            return "only the second harmonic inside the band"
        return "only the second and third harmonic inside the band" if self.harmonics_inside == 2 else ""


@attrs.frozen
class FrequencyCurve:
    """One channel into one load, by rising frequency."""

    row: Row
    points: tuple[FrequencyPoint, ...]
    notes: tuple[Note, ...]


@attrs.frozen
class FrequencyResult:
    """What `frequency` found."""

    plan: FrequencyPlan
    curves: tuple[FrequencyCurve, ...]
    said: tuple[Note, ...] = ()


def conclude(plan: FrequencyPlan, place: AroundPlace, records: Sequence[Kept | Said]) -> FrequencyResult:
    """Return what kept readings and findings amount to; of the readings at one tone the last counts."""
    curves = []
    for row in rows_of(plan.guarded(), place):
        own = [
            each for each in records if isinstance(each, Kept) and each.mark is not None and each.mark.row == row.index
        ]
        if not own:
            continue
        last = {round(each.figures[0].at_hz, 6): each for each in own if each.figures}
        points = tuple(_point(plan, place, hz, kept) for hz, kept in sorted(last.items()))
        said = tuple(each.note for each in records if isinstance(each, Said) and each.row in {row.index, 0})
        curves.append(FrequencyCurve(row, points, (*said, *_notes(plan, points))))
    return FrequencyResult(plan, tuple(curves), said_notes(records))


def _point(plan: FrequencyPlan, place: AroundPlace, hz: float, kept: Kept) -> FrequencyPoint:
    high_hz = min(plan.high_hz, place.rate_hz / 2.0)
    inside = max(0, int(high_hz * _EDGE / hz) - 1)
    reading = kept.reading
    stated = _with_settling(reading.thdn, hz) if inside else None
    return FrequencyPoint(hz, reading.level_vrms, stated, reading.thd if inside else None, reading.noise, inside)


def _with_settling(thdn: Quantity | None, hz: float) -> Quantity | None:
    """Return THD+N with what a coupling that still settles inside a burst may have added to it."""
    if thdn is None or hz >= BURST_BELOW_HZ:
        return thdn
    u = rectangular(math.hypot(thdn.value, SETTLING) - thdn.value)
    return attrs.evolve(thdn, parts=(*thdn.parts, Part("settling", u)))


def _notes(plan: FrequencyPlan, points: Sequence[FrequencyPoint]) -> list[Note]:
    departures = [
        abs(point.level_vrms.value / plan.level_vrms - 1.0) for point in points if point.level_vrms is not None
    ]
    found = []
    if departures:
        found.append(note(Kind.STEERED, vrms=plan.level_vrms, percent=100.0 * max(departures)))
    if any(point.harmonics_inside == 0 for point in points):
        found.append(note(Kind.HARMONICS_LEAVE, frequency_hz=plan.high_hz / 2.0, high_hz=plan.high_hz))
    return found
