"""Output resistance and damping factor: one drive, two loads (or one and none), the complex voltages compared."""

import math
from collections.abc import Sequence

import attrs

from wattproof.core import checks
from wattproof.core.errors import StoppedError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import Quantity
from wattproof.core.units import DB_PER_RELATIVE
from wattproof.core.wording import sentence
from wattproof.dsp.intervals import rectangular
from wattproof.dsp.load import resistance
from wattproof.dsp.output_impedance import AcrossLoad, Damping, OutputImpedance, damping, output_impedance
from wattproof.procedures.around_plan import AroundPlace, AroundPlan, frequencies
from wattproof.procedures.driving import Doing, Muted
from wattproof.procedures.power_plan import numbers
from wattproof.procedures.power_rows import OPEN_LOAD_OHM, Row, rows_of
from wattproof.procedures.power_switching import FULL, REPEATS_DB, begin, switch
from wattproof.procedures.requests import Kept, Mark, Procedure, Role, Said
from wattproof.procedures.stepping import Stepping, bursts_said, gain_of, in_bursts, said_notes

AGAIN = "again"  # the first load once more, at the end: what has drifted meanwhile
BAND_END = 0.45
CLEAR_HZ = 4.0


@attrs.frozen(kw_only=True)
class OutputResistancePlan(AroundPlan):
    """Settings of `output-resistance`."""

    loads: str = declared(
        "8,4", label="Loads", unit="Ω", help='two loads in order, the higher first, as "8,4"; 1e6 is none at all'
    )
    level_vrms: float = declared(
        2.0, label="Level", unit="V rms", help="output at 997 Hz at the first load", validator=checks.positive
    )
    from_hz: float = declared(50.0, label="From", unit="Hz", minimum=10.0, maximum=5_000.0, help="lowest tone")
    to_hz: float = declared(20_000.0, label="To", unit="Hz", minimum=1_500.0, maximum=80_000.0, help="highest tone")
    per_octave: float = declared(1.0, label="Steps", unit="an octave", minimum=0.2, maximum=12.0, help="tones")
    read_s: float = declared(0.5, label="Reading", unit="s", minimum=0.1, maximum=10.0, help="of each tone")

    measured_ohm: str = declared(
        "",
        label="Measured loads",
        unit="Ω",
        help='what each load has, four-wire at its terminals, as "8.02,4.01"; empty: as the rig and its tolerance say',
    )

    def __attrs_post_init__(self) -> None:
        super().__attrs_post_init__()
        if self.measured and len(self.measured) != 2:
            raise ValueError(f'measured-ohm is "{self.measured_ohm}"; give one for each load, as 8.02,4.01')
        loads = self.guarded().loads_ohm
        if len(loads) != 2 or loads[0] <= loads[1]:
            raise ValueError(f'loads is "{self.loads}"; give two, the higher first, as 8,4 or 1e6,8')

    @property
    def measured(self) -> tuple[float, ...]:
        """The measured resistances in the order of the loads; none where none were given."""
        return numbers("measured-ohm", self.measured_ohm, 0.1)

    def tones_hz(self, rate_hz: float) -> tuple[float, ...]:
        """Return the tones, those in bursts last."""
        tones = frequencies(self.from_hz, min(self.to_hz, BAND_END * rate_hz), self.per_octave, CLEAR_HZ)
        return tuple(sorted(tones, key=lambda hz: (in_bursts(hz), hz)))


def output_resistance(plan: OutputResistancePlan, place: AroundPlace) -> Procedure:
    """Read every channel at both loads with the same drive, then the first load once more.

    Raises:
        WrongUseError: no volts are known.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan.guarded(), place)
    stepping = Stepping(plan, place, rows[0])
    yield from begin(stepping, FULL)
    yield from bursts_said(plan.tones_hz(place.rate_hz), rows[0])
    run = _Run(plan, place, stepping)
    first = [row for row in rows if row.load == rows[0].load]
    load_in_ohm = place.rig.wirings[0].load.nominal_ohm
    try:
        for row, at in (*((row, "") for row in rows), *((row, AGAIN) for row in first)):
            yield from switch(stepping, row, load_in_ohm)
            load_in_ohm = row.load.nominal_ohm
            yield from run.row(row, at)
    except Muted as muted:
        yield Said(muted.why, stepping.row.index)
        raise StoppedError(sentence(muted.why)) from muted
    yield from stepping.silence()


@attrs.define(eq=False)
class _Run:
    plan: OutputResistancePlan
    place: AroundPlace
    stepping: Stepping
    drives_fs: dict[int, float] = attrs.field(factory=dict)  # by channel: the same at both loads
    done: int = 0

    def row(self, row: Row, at: str) -> Doing[None]:
        level_fs = self.drives_fs.get(row.channel)
        if level_fs is None:
            yield from self.stepping.reach(self.plan.level_vrms)
            level_fs = self.drives_fs[row.channel] = self.stepping.level_fs
        tones_hz = self.plan.tones_hz(self.place.rate_hz)
        for tone_hz in tones_hz[:1] if at == AGAIN else tones_hz:
            self.stepping.tune(tone_hz)
            self.done += 1
            yield self.stepping.doing(self.done, max(self.done, 4 * len(tones_hz)), "voltage at the load", 0.0)
            yield from self.stepping.point(level_fs, self.plan.read_s, Mark(Role.STEP, at=at))
        yield from self.stepping.silence()


@attrs.frozen
class ImpedancePoint:
    """One tone: impedance in ohm and damping factor at the load that takes the power (the lower one)."""

    frequency_hz: float
    impedance: OutputImpedance
    damping: Damping


@attrs.frozen
class ImpedanceCurve:
    """One channel, by rising frequency; the damping factor is stated at `load_ohm`."""

    row: Row
    load_ohm: float
    points: tuple[ImpedancePoint, ...]
    drift: float  # relative, from the first load to the same once more
    notes: tuple[Note, ...]


@attrs.frozen
class ImpedanceResult:
    """What `output-resistance` found."""

    plan: OutputResistancePlan
    curves: tuple[ImpedanceCurve, ...]
    said: tuple[Note, ...] = ()


def conclude(plan: OutputResistancePlan, place: AroundPlace, records: Sequence[Kept | Said]) -> ImpedanceResult:
    """Return what kept readings and findings amount to."""
    rows = rows_of(plan.guarded(), place)
    kept = [each for each in records if isinstance(each, Kept) and each.mark is not None]
    curves = []
    for channel in plan.guarded().channel_list:
        over, under = (row for row in rows if row.channel == channel)
        curve = _curve(*_measured(plan, over, under), kept)
        said = tuple(each.note for each in records if isinstance(each, Said) and each.row in {0, over.index})
        if curve is not None:
            curves.append(attrs.evolve(curve, notes=(*said, *curve.notes)))
    return ImpedanceResult(plan, tuple(curves), said_notes(records))


def _measured(plan: OutputResistancePlan, over: Row, under: Row) -> tuple[Row, Row]:
    """Return both rows with their loads as they were measured, where they were."""
    if not plan.measured:
        return over, under
    first, second = (
        attrs.evolve(row, load=attrs.evolve(row.load, measured_ohm=ohm))
        for row, ohm in zip((over, under), plan.measured, strict=True)
    )
    return first, second


def _curve(over: Row, under: Row, kept: Sequence[Kept]) -> ImpedanceCurve | None:
    at_over, at_under = _across(over, kept, ""), _across(under, kept, "")
    again = _across(over, kept, AGAIN)
    drift = max((abs(again[hz].volts / at_over[hz].volts) - 1.0 for hz in again if hz in at_over), key=abs, default=0.0)
    repeats = max(REPEATS_DB / DB_PER_RELATIVE, rectangular(abs(drift)))
    stated_ohm = _stated_ohm(over, under)
    points = []
    for hz in sorted(at_over.keys() & at_under.keys()):
        impedance = output_impedance(at_over[hz], at_under[hz], repeats)
        points.append(ImpedancePoint(hz, impedance, damping(stated_ohm, impedance.magnitude)))
    if not points:
        return None
    notes = [note(Kind.SENSE_POINT)]
    unsure = next((point for point in points if point.damping.high is None), None)
    if unsure is not None:
        notes.append(note(Kind.DAMPING_UNSURE, frequency_hz=unsure.frequency_hz, named=unsure.damping.words))
    return ImpedanceCurve(over, stated_ohm, tuple(points), drift, tuple(notes))


def _stated_ohm(over: Row, under: Row) -> float:
    return under.load.ohm if over.load.nominal_ohm >= OPEN_LOAD_OHM else over.load.ohm


def _across(row: Row, kept: Sequence[Kept], at: str) -> dict[float, AcrossLoad]:
    found = {}
    for each in kept:
        gain = gain_of(each, row.wiring.input)
        if each.mark is None or each.mark.row != row.index or each.mark.at != at or gain is None:
            continue
        ohm = resistance(row.load, row.wiring.name)
        name = f"{row.load.nominal_ohm:g} Ω"
        apart = tuple(attrs.evolve(part, source=f"{part.source} {name}") for part in ohm.parts)
        size = math.inf if row.load.nominal_ohm >= OPEN_LOAD_OHM else ohm.value
        quantity = Quantity(1e12, "Ω") if math.isinf(size) else Quantity(size, "Ω", apart)
        found[gain.frequency_hz] = AcrossLoad(quantity, gain.z, gain.u)
    return found
