"""The power statement from what was kept: a pure conclusion, the same at the end, at a stop and when checked again."""

import math
from collections.abc import Sequence
from itertools import pairwise

import attrs

from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import STATISTICS, Part, Quantity
from wattproof.core.reading import Reading
from wattproof.dsp.onset import NoOnset, Onset, find_onset
from wattproof.dsp.power_curve import Crossing, LeftOut, Point, crossing_of, curve_of, left_out, point_of
from wattproof.dsp.uncertainty import named_scatter, ratio
from wattproof.procedures.power_plan import PowerPlan, Target
from wattproof.procedures.power_rows import Row
from wattproof.procedures.presets import Requirement, requirements
from wattproof.procedures.requests import Kept, Mark, Role, Said
from wattproof.procedures.verdicts import claim_notes, flattering_notes

SETTLED_MISS = 0.006  # 0.05 dB of level by which a hold may miss its point at the end, and still be carried to it
LAST_READINGS = 3  # of a hold: their scatter says how well it stood
_CARRIED = 0.5  # of what a held value was carried by the curve's slope: how well that slope is known


@attrs.frozen
class StatedPoint:
    """One point of one row. `held_s` is 0 for a momentary value; without a value `why` says so.

    `momentary_vrms` and `momentary_w` are what the curve gave before the point was held.
    """

    at: str
    voltage_vrms: Quantity | None = None
    power_w: Quantity | None = None
    thdn: Quantity | None = None
    held_s: float = 0.0
    why: Note | None = None
    momentary_vrms: Quantity | None = None
    momentary_w: Quantity | None = None


@attrs.frozen
class CurveReading:
    """One kept reading of a row's curve: `left_out` says why it does not count; `number` is that of its row."""

    number: int
    mark: Mark
    reading: Reading
    point: Point | None
    left_out: str = ""


@attrs.frozen
class StatedRow:
    """One channel into one load."""

    row: Row
    points: tuple[StatedPoint, ...]
    notes: tuple[Note, ...]

    def at(self, name: str) -> StatedPoint | None:
        """Return the point of that name, or None."""
        return next((point for point in self.points if point.at == name), None)


@attrs.frozen
class LoadRatio:
    """How much more power a channel gives into one load than into another, at the same point."""

    channel: int
    at: str
    over_ohm: float
    under_ohm: float
    ratio: Quantity


@attrs.frozen
class PowerStatement:
    """What was found: rows, ratios between loads, the whole curve, and the conditions that were asked for."""

    plan: PowerPlan
    rows: tuple[StatedRow, ...]
    ratios: tuple[LoadRatio, ...]
    curve: tuple[CurveReading, ...]
    conditions: tuple[Requirement, ...]


def conclude(plan: PowerPlan, rows: Sequence[Row], records: Sequence[Kept | Said]) -> PowerStatement:
    """Return the statement that kept readings and findings amount to, however the run ended."""
    curve: list[CurveReading] = []
    stated = []
    for row in rows:
        kept = [each for each in records if isinstance(each, Kept) and each.mark is not None]
        own = [each for each in kept if each.mark is not None and each.mark.row == row.index]
        said = [each.note for each in records if isinstance(each, Said) and each.row == row.index]
        readings = _curve_readings(row, own)
        curve += readings
        if own or said:
            stated.append(_stated(plan, row, own, said, readings))
    done = tuple(stated)
    return PowerStatement(plan, done, _ratios(done), tuple(curve), requirements(plan, done))


def _curve_readings(row: Row, kept: Sequence[Kept]) -> list[CurveReading]:
    """Return the readings of a row's curve in the order of time, with what a scratchy control left out."""
    on_curve = [(each.reading, each.mark) for each in kept if each.mark is not None and _on_curve(each.mark)]
    points = [point_of(reading, mark.stroke) for reading, mark in on_curve]
    by_hand = [index for index, (_, mark) in enumerate(on_curve) if mark.role is Role.STROKE]
    fit = [index for index in by_hand if points[index] is not None]
    judged = left_out([point for index in fit if (point := points[index]) is not None])
    out = {fit[index]: why.value for index, why in judged.items()}
    out |= {index: LeftOut.JUMP.value for index in by_hand if points[index] is None}
    return [
        CurveReading(row.index, mark, reading, points[index], mark.left_out or out.get(index, ""))
        for index, (reading, mark) in enumerate(on_curve)
    ]


def _on_curve(mark: Mark) -> bool:
    return mark.role in {Role.STEP, Role.STROKE}


def _stated(
    plan: PowerPlan, row: Row, kept: Sequence[Kept], said: Sequence[Note], readings: Sequence[CurveReading]
) -> StatedRow:
    counted = [each for each in readings if each.point is not None and not each.left_out]
    maker = _Points(plan, [each.point for each in counted if each.point], [each.reading for each in counted], kept)
    points = tuple(maker.stated(target) for target in plan.targets)
    notes = [*said, *_scratches(readings), *maker.notes]
    notes += flattering_notes(plan, row, points) + claim_notes(plan, row, points, maker.readings)
    return StatedRow(row, points, tuple(dict.fromkeys(notes)))


def _scratches(readings: Sequence[CurveReading]) -> list[Note]:
    jumps = sum(each.left_out == LeftOut.JUMP for each in readings)
    crackles = sum(each.left_out == LeftOut.CRACKLE for each in readings)
    return [note(Kind.SCRATCHY, jumps=jumps, crackles=crackles)] if jumps + crackles else []


class _Points:
    """Makes the points of one row from its curve and its held readings."""

    def __init__(self, plan: PowerPlan, points: list[Point], readings: list[Reading], kept: Sequence[Kept]) -> None:
        self.plan, self.points, self.readings = plan, points, readings
        self.held = [each for each in kept if each.mark is not None and each.mark.role is Role.HELD]
        self.notes: list[Note] = []

    def stated(self, target: Target) -> StatedPoint:
        """Return one point: held where it was held and settled, else momentary, else why there is none."""
        if not self.points:
            return StatedPoint(target.name, why=note(Kind.NOT_LOOKED_FOR))
        found = self._found(target)
        if isinstance(found, Note):
            return StatedPoint(target.name, why=found)
        volts, watts, thdn = self._quantities(found)
        momentary = StatedPoint(target.name, volts, watts, thdn, 0.0, None, volts, watts)
        held = self._held(target, found)
        if held is None:
            return momentary
        return attrs.evolve(held, momentary_vrms=volts, momentary_w=watts)

    def _found(self, target: Target) -> Crossing | Note:
        highest = max(point.voltage_vrms for point in self.points)
        if target.thdn is not None:
            crossing = crossing_of(self.points, target.thdn)
            return crossing or note(Kind.NOT_CROSSED, percent=100.0 * target.thdn, vrms=highest)
        found = self._onset()
        if found is NoOnset.GRADUAL:
            return note(Kind.ONSET_GRADUAL)
        if found is NoOnset.BEGIN_LOWER:
            return note(Kind.ONSET_BEGIN_LOWER)
        if isinstance(found, NoOnset):
            return note(Kind.ONSET_NOT_REACHED, vrms=highest)
        crossing = crossing_of(self.points, found.thdn)
        slope = crossing.slope if crossing is not None else 1.0
        return Crossing(found.thdn, found.voltage_vrms, found.u_vrms, slope)

    def _onset(self) -> Onset | NoOnset:
        """Return the onset over the strokes: the mean, with half the difference in its uncertainty."""
        strokes = sorted({point.stroke for point in self.points})
        each = [find_onset(curve_of([p for p in self.points if p.stroke == stroke])) for stroke in strokes]
        found = [onset for onset in each if isinstance(onset, Onset)]
        if not found:
            return each[0]
        volts = [onset.voltage_vrms for onset in found]
        own = math.hypot(*(onset.u_vrms for onset in found)) / len(found)
        u = math.hypot(own, (max(volts) - min(volts)) / 2.0)
        return attrs.evolve(found[0], voltage_vrms=sum(volts) / len(volts), u_vrms=u)

    def _quantities(self, found: Crossing) -> tuple[Quantity | None, Quantity | None, Quantity]:
        reading = self._nearest(found.voltage_vrms)
        return _carried(reading, found.voltage_vrms, found.u_vrms, found.thdn)

    def _nearest(self, vrms: float) -> Reading:
        index = min(range(len(self.points)), key=lambda i: abs(math.log(self.points[i].voltage_vrms / vrms)))
        return self.readings[index]

    def _held(self, target: Target, found: Crossing) -> StatedPoint | None:
        """Return the value at the end of the last whole hold, carried to its THD+N along the curve; None: not held."""
        own = [each for each in self.held if each.mark is not None and each.mark.at == target.name]
        last = own[-1] if own else None
        point = None if last is None else point_of(last.reading)
        if last is None or last.mark is None or point is None or last.mark.held_s < self.plan.hold_s - 1e-6:
            return None
        miss = math.log(point.thdn / found.thdn)
        if abs(miss / found.slope) > SETTLED_MISS:
            self.notes.append(note(Kind.NOT_SETTLED, named=target.name, percent=100.0 * point.thdn))
            return None
        carried = -miss / found.slope
        vrms = point.voltage_vrms * math.exp(carried)
        tail = [tail_point for each in own[-LAST_READINGS:] if (tail_point := point_of(each.reading)) is not None]
        even = [math.log(p.voltage_vrms) - math.log(p.thdn / found.thdn) / found.slope for p in tail]
        spread = (max(even) - min(even)) / math.sqrt(12.0)
        scatter = point.u_thdn / point.thdn / found.slope
        u_relative = math.hypot(spread, scatter, _CARRIED * carried)
        if target.thdn is None:
            u_relative = math.hypot(u_relative, found.u_vrms / found.voltage_vrms)
        volts, watts, _ = _carried(last.reading, vrms, vrms * u_relative, found.thdn)
        return StatedPoint(target.name, volts, watts, last.reading.thdn, last.mark.held_s)


def _carried(
    reading: Reading, vrms: float, u_vrms: float, thdn: float
) -> tuple[Quantity | None, Quantity | None, Quantity]:
    """Return V, W and THD+N at a voltage near a reading: its budget, with the scatter that the curve gives."""
    relative = vrms / reading.level_vrms.value if reading.level_vrms is not None else 1.0
    volts = _scaled(reading.level_vrms, relative, u_vrms / vrms)
    watts = _scaled(reading.power_w, relative**2, 2.0 * u_vrms / vrms)
    u_thdn = 0.0 if reading.thdn is None or not reading.thdn.value else thdn * reading.thdn.u / reading.thdn.value
    return volts, watts, Quantity(thdn, "1", (Part(STATISTICS, u_thdn),))


def _scaled(quantity: Quantity | None, factor: float, u_relative: float) -> Quantity | None:
    if quantity is None:
        return None
    value = quantity.value * factor
    known = tuple(attrs.evolve(part, u=part.u * factor) for part in quantity.parts if part.source != STATISTICS)
    return Quantity(value, quantity.unit, (Part(STATISTICS, value * u_relative), *known), quantity.limited_by)


def _ratios(rows: Sequence[StatedRow]) -> tuple[LoadRatio, ...]:
    """Return the ratios of power between the loads of each channel, the lower load over the next higher one."""
    found: list[LoadRatio] = []
    for channel in sorted({stated.row.channel for stated in rows}):
        own = sorted((each for each in rows if each.row.channel == channel), key=lambda each: each.row.load.ohm)
        for over, under in pairwise(own):
            for point in over.points:
                other = under.at(point.at)
                if other is None or point.power_w is None or other.power_w is None:
                    continue
                first, second = named_scatter(point.power_w, "over"), named_scatter(other.power_w, "under")
                ohms = over.row.load.nominal_ohm, under.row.load.nominal_ohm
                found.append(LoadRatio(channel, point.at, *ohms, ratio(first, second)))
    return tuple(found)
