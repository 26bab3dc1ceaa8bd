"""What a response run amounts to: curves relative to 997 Hz or to flat, −3 dB points, peaks, distortion by order."""

import cmath
import math
from collections.abc import Sequence

import attrs
import numpy as np

from wattproof.core.loopback import Response
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import STATISTICS, Part, Quantity
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.dsp.attenuation import cable_factor
from wattproof.dsp.correction import in_reach, limit
from wattproof.dsp.interface_floor import Levels, own_lines
from wattproof.dsp.intervals import rectangular
from wattproof.procedures.around_plan import REFERENCE_HZ, AroundPlace
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.requests import Figure, Kept, Said
from wattproof.procedures.response import FLAT, LOOP, SET, ResponsePlan
from wattproof.procedures.stepping import Gain, gain_of, said_notes

HALF_POWER = math.sqrt(0.5)
PEAK_WORTH_DB = 0.1
_DELAY_FROM_HZ, _DELAY_TO_HZ = 300.0, 6_000.0
_LONGEST_DELAY_S = 0.6
# What the method leaves, as limits in dB and degrees: settling of couplings inside a burst, the mean over a twelfth of
# an octave of a sweep, its window at the bottom. Our own measurement against filters of closed form.
_STEPPED_LIMITS, _STEPPED_LOW_LIMITS = (0.001, 0.01), (0.008, 0.08)
_SWEPT_LIMITS, _SWEPT_LOW_LIMITS = (0.003, 0.05), (0.02, 0.2)
_BISECTIONS = 40
_BENT = 0.25  # of what the cubic lies off a straight line: how well the bend between two points is known
_LOW_STEPPED_HZ, _LOW_SWEPT_HZ = 40.0, 50.0


@attrs.frozen
class ResponsePoint:
    """One frequency: `relative` is the level over that at 997 Hz, or over flat at the same frequency (plain ratio)."""

    frequency_hz: float
    relative: Quantity
    phase_deg: Quantity | None

    @property
    def power_ratio(self) -> float:
        """The same in power."""
        return self.relative.value**2


@attrs.frozen
class OrderPoint:
    """Harmonic distortion of one order at a fundamental, as a ratio to the fundamental."""

    order: int
    frequency_hz: float
    ratio: Quantity


@attrs.frozen(eq=False)
class ResponseCurve:
    """One channel into one load. `stepped` and `swept` may be empty; `low_hz` and `high_hz` are the −3 dB points."""

    row: Row
    level_vrms: Quantity | None
    stepped: tuple[ResponsePoint, ...]
    swept: tuple[ResponsePoint, ...]
    orders: tuple[OrderPoint, ...]
    low_hz: Quantity | None
    high_hz: Quantity | None
    peak: ResponsePoint | None
    notes: tuple[Note, ...]


@attrs.frozen(eq=False)
class ResponseResult:
    """What `response` found."""

    plan: ResponsePlan
    curves: tuple[ResponseCurve, ...]
    said: tuple[Note, ...] = ()


def conclude(plan: ResponsePlan, place: AroundPlace, records: Sequence[Kept | Said]) -> ResponseResult:
    """Return what kept readings and findings amount to, however the run ended."""
    rows = rows_of(plan.guarded(), place)
    kept = [each for each in records if isinstance(each, Kept) and each.mark is not None]
    loops = [each for each in kept if each.mark is not None and each.mark.at.startswith(LOOP)]
    curves = []
    for row in rows:
        own = [each for each in kept if each.mark is not None and each.mark.row == row.index and each not in loops]
        socket_loops = [each for each in loops if each.reading.channel == row.wiring.input]
        said = tuple(each.note for each in records if isinstance(each, Said) and each.row in {row.index, 0})
        if own:
            curves.append(_Curve(plan, place, row, own, socket_loops).made(said))
    return ResponseResult(plan, tuple(curves), said_notes(records))


@attrs.define(eq=False)
class _Curve:
    plan: ResponsePlan
    place: AroundPlace
    row: Row
    kept: list[Kept]
    loops: list[Kept]

    def made(self, said: tuple[Note, ...]) -> ResponseCurve:
        notes = list(said)
        stepped = self._points(self._stepped(SET), self._stepped(FLAT), self._stepped(LOOP), notes, sweep=False)
        swept = self._points(self._swept(SET), self._swept(FLAT), self._swept(LOOP), notes, sweep=True)
        curve = swept or stepped
        low, high = _crossings(curve, HALF_POWER)
        peak = max((p for p in curve if p.frequency_hz > REFERENCE_HZ), key=lambda p: p.relative.value, default=None)
        notes += self._told(curve, peak)
        reading = next((each.reading for each in self.kept if each.reading.level_vrms is not None), None)
        return ResponseCurve(
            self.row,
            None if reading is None else reading.level_vrms,
            stepped,
            swept,
            self._orders(),
            low,
            high,
            peak,
            tuple(dict.fromkeys(notes)),
        )

    def _told(self, curve: Sequence[ResponsePoint], peak: ResponsePoint | None) -> list[Note]:
        found = [note(Kind.LOOP_TAKEN_OUT)] if self.loops else []
        if not self.loops and not self.plan.relative:
            known = self.place.calibration.loop(self.row.wiring.input)
            found.append(note(Kind.LOOP_INSIDE) if known is None else note(Kind.LOOP_TAKEN_OUT))
        if self.plan.relative:
            found.append(note(Kind.RELATIVE_TO_FLAT))
            found += self._boost(curve)
        elif peak is not None and db(peak.relative.value) > PEAK_WORTH_DB:
            ohm = self.row.load.nominal_ohm
            height, at_hz = db(peak.relative.value), peak.frequency_hz
            found.append(note(Kind.PEAKS_AT, channel=self.row.channel, load_ohm=ohm, db=height, frequency_hz=at_hz))
        return found

    def _boost(self, curve: Sequence[ResponsePoint]) -> list[Note]:
        top = max(curve, key=lambda point: point.relative.value, default=None)
        if top is None or db(top.relative.value) <= PEAK_WORTH_DB:
            return []
        level_w = self.plan.listening_w or self.plan.level_vrms**2 / self.row.load.ohm
        ratio = top.power_ratio
        return [
            note(
                Kind.BOOST_COSTS,
                channel=self.row.channel,
                db=db(top.relative.value),
                frequency_hz=top.frequency_hz,
                ratio=ratio,
                level_w=level_w,
                needed_w=ratio * level_w,
            )
        ]

    def _stepped(self, name: str) -> list[Gain]:
        """Return the gains of a pass, the one at the reference first."""
        source = self.loops if name == LOOP else self.kept
        own = [each for each in source if each.mark is not None and each.mark.at == name]
        return [gain for each in own if (gain := gain_of(each, self.row.wiring.input)) is not None]

    def _swept(self, name: str) -> list[Gain]:
        source = self.loops if name == LOOP else self.kept
        own = next((each for each in source if each.mark is not None and each.mark.at == f"{name} sweep"), None)
        if own is None:
            return []
        socket, rate_hz = self.row.wiring.input, own.reading.span.rate_hz
        delay_s = next(each.value for each in own.figures if each.name == "delay_frames") / rate_hz
        re = {each.at_hz: each for each in own.figures if each.name == f"re {socket}"}
        im = {each.at_hz: each for each in own.figures if each.name == f"im {socket}"}
        return [
            Gain(hz, complex(re[hz].value, im[hz].value) * cmath.exp(-2j * math.pi * hz * delay_s), re[hz].u)
            for hz in re
        ]

    def _points(
        self, gains: list[Gain], flat: list[Gain], loop: list[Gain], notes: list[Note], *, sweep: bool
    ) -> tuple[ResponsePoint, ...]:
        if not gains:
            return ()
        under = flat if self.plan.relative else loop
        known = {each.frequency_hz: each for each in under}
        ratios = [_over(each, known.get(each.frequency_hz)) for each in gains]
        phases = _phases([each.z for each in ratios], [each.frequency_hz for each in ratios], bool(known), notes)
        if not all(each.one_clock for each in ratios):
            notes.append(note(Kind.CLOCKS_DIFFER))
            phases = [None] * len(ratios)
        reference = self._reference(ratios, sweep=sweep)
        made = []
        for each, phase in zip(ratios, phases, strict=True):
            if each is ratios[0] and not sweep:
                continue  # the reference was read to set the scale
            limits_db, limits_deg = _left_by_method(each.frequency_hz, sweep=sweep)
            relative = self._relative(each, reference, limits_db)
            parts = Part(STATISTICS, math.degrees(each.u / abs(each.z))), Part("method", rectangular(limits_deg))
            stated = None if phase is None else Quantity(phase, "°", parts)
            made.append(ResponsePoint(each.frequency_hz, relative, stated))
        return tuple(sorted(made, key=lambda point: point.frequency_hz))

    def _reference(self, ratios: list[Gain], *, sweep: bool) -> Gain:
        if self.plan.relative:
            return Gain(REFERENCE_HZ, 1.0 + 0.0j, 0.0)
        if not sweep:
            return ratios[0]
        logs = np.log([each.frequency_hz for each in ratios])
        level = math.exp(float(np.interp(math.log(REFERENCE_HZ), logs, [math.log(abs(each.z)) for each in ratios])))
        nearest = min(ratios, key=lambda each: abs(math.log(each.frequency_hz / REFERENCE_HZ)))
        return Gain(REFERENCE_HZ, complex(level), nearest.u)

    def _relative(self, each: Gain, reference: Gain, limits_db: float) -> Quantity:
        """Return |gain| over |reference|, less the cable and, where no loop was read now, the calibrated response."""
        value = abs(each.z) / abs(reference.z)
        if not self.plan.relative:
            attenuator = self.row.wiring.attenuator
            value *= cable_factor(attenuator, each.frequency_hz) / cable_factor(attenuator, REFERENCE_HZ)
            calibrated = self.place.calibration.loop(self.row.wiring.input)
            if not self.loops and calibrated is not None:
                value /= _gain_in(calibrated.response, each.frequency_hz) / _gain_in(calibrated.response, REFERENCE_HZ)
        u = value * math.hypot(each.u / abs(each.z), reference.u / abs(reference.z))
        method = Part("method", value * rectangular(limits_db) / DB_PER_RELATIVE)
        return Quantity(value, "1", (Part(STATISTICS, u), method))

    def _orders(self) -> tuple[OrderPoint, ...]:
        own = next((each for each in self.kept if each.mark is not None and each.mark.at == f"{SET} sweep"), None)
        if own is None or own.mark is None:
            return ()
        first = {each.frequency_hz: abs(each.z) for each in self._swept(SET)}
        top_fs = max(first.values()) * own.mark.drive_fs
        bounds = own_lines(self.place.calibration, self.row.wiring, Levels(top_fs, own.mark.drive_fs))
        found = []
        for figure in own.figures:
            if not figure.name.startswith("order "):
                continue
            order = int(figure.name.removeprefix("order "))
            added = bounds[order].ratio if order in bounds else 0.0
            found.append(OrderPoint(order, figure.at_hz, _order_ratio(figure, first[figure.at_hz], added)))
        return tuple(found)


def _order_ratio(figure: Figure, fundamental: float, added: float) -> Quantity:
    """Return one order's ratio to the fundamental; a limit where noise or the interface may be all of it."""
    u = figure.u / fundamental
    seen = Quantity(figure.value / fundamental, "1", (Part(STATISTICS, u),))
    if seen.value < 3.0 * u:
        return limit(seen, added, "noise")
    if added and in_reach(seen, added):
        return limit(seen, added)
    return (
        seen if not added else attrs.evolve(seen, parts=(*seen.parts, Part("interface floor", added / math.sqrt(2.0))))
    )


def _left_by_method(frequency_hz: float, *, sweep: bool) -> tuple[float, float]:
    if sweep:
        return _SWEPT_LOW_LIMITS if frequency_hz < _LOW_SWEPT_HZ else _SWEPT_LIMITS
    return _STEPPED_LOW_LIMITS if frequency_hz < _LOW_STEPPED_HZ else _STEPPED_LIMITS


def _over(each: Gain, under: Gain | None) -> Gain:
    if under is None:
        return each
    z = each.z / under.z
    u = abs(z) * math.hypot(each.u / abs(each.z), under.u / abs(under.z))
    return Gain(each.frequency_hz, z, u, each.one_clock and under.one_clock)


def _phases(gains: list[complex], at_hz: list[float], referred: bool, notes: list[Note]) -> list[float | None]:  # noqa: FBT001
    """Return phases in degrees; where nothing tells the way round, less the delay that fits best."""
    z = np.array(gains)
    hz = np.array(at_hz)
    if not referred:
        delay_s = _delay_s(z, hz)
        if delay_s is None:
            return [None] * z.size
        notes.append(note(Kind.DELAY_TAKEN_OUT, delay_us=1e6 * delay_s))
        z = z * np.exp(2j * np.pi * hz * delay_s)
    return [float(each) for each in np.degrees(np.angle(z))]


def _delay_s(
    z: np.ndarray[tuple[int], np.dtype[np.complex128]], hz: np.ndarray[tuple[int], np.dtype[np.float64]]
) -> float | None:
    """Return the delay that brings the phases from 300 Hz to 6 kHz together, or None where too few points tell."""
    inside = (hz >= _DELAY_FROM_HZ) & (hz <= _DELAY_TO_HZ)
    if int(inside.sum()) < 4:
        return None
    turns = z[inside] / np.abs(z[inside])
    tones = hz[inside]
    step_s = 0.1 / _DELAY_TO_HZ
    delays = np.arange(0.0, _LONGEST_DELAY_S, step_s)
    best, height = 0.0, -1.0
    for first in range(0, delays.size, 4096):
        some = delays[first : first + 4096]
        sums = np.abs(np.exp(2j * np.pi * np.outer(some, tones)) @ turns)
        top = int(np.argmax(sums))
        if sums[top] > height:
            best, height = float(some[top]), float(sums[top])
    left = np.angle(turns * np.exp(2j * np.pi * tones * best))
    slope = np.polyfit(2.0 * np.pi * tones, np.unwrap(left), 1)[0]
    return best - float(slope)


def _gain_in(response: Response, frequency_hz: float) -> float:
    if not response.frequency_hz.size:
        return 1.0
    logs = np.log(np.abs(response.gain))
    return math.exp(float(np.interp(math.log(frequency_hz), np.log(response.frequency_hz), logs)))


def _crossings(curve: Sequence[ResponsePoint], at: float) -> tuple[Quantity | None, Quantity | None]:
    """Return the frequencies below and above 997 Hz beyond which the level stays under a ratio; None: not reached."""
    below = _crossing([point for point in reversed(curve) if point.frequency_hz <= REFERENCE_HZ], at)
    above = _crossing([point for point in curve if point.frequency_hz >= REFERENCE_HZ], at)
    return below, above


def _crossing(outward: Sequence[ResponsePoint], at: float) -> Quantity | None:
    for index in range(1, len(outward)):
        if outward[index].relative.value < at <= outward[index - 1].relative.value:
            around = outward[max(index - 2, 0) : index + 2]
            return _between(around, outward[index - 1], outward[index], at)
    return None


def _between(around: Sequence[ResponsePoint], inner: ResponsePoint, outer: ResponsePoint, at: float) -> Quantity:
    """Return where a cubic through the points around (level in dB over log frequency) passes a level."""
    places = [math.log(point.frequency_hz) for point in around]
    levels = [db(point.relative.value) for point in around]
    near, far = math.log(inner.frequency_hz), math.log(outer.frequency_hz)
    near_db, far_db, wanted_db = db(inner.relative.value), db(outer.relative.value), db(at)
    slope = (far_db - near_db) / (far - near)
    straight = near + (wanted_db - near_db) / slope
    for _ in range(_BISECTIONS):
        middle = (near + far) / 2.0
        near, far = (middle, far) if _cubic(places, levels, middle) >= wanted_db else (near, middle)
    place = (near + far) / 2.0
    u_db = DB_PER_RELATIVE * max(inner.relative.u / inner.relative.value, outer.relative.u / outer.relative.value)
    u = math.exp(place) * math.hypot(u_db / slope, _BENT * (place - straight))
    return Quantity(math.exp(place), "Hz", (Part(STATISTICS, u),))


def _cubic(places: Sequence[float], levels: Sequence[float], at: float) -> float:
    """Return Lagrange's polynomial through the points, at a place."""
    return math.fsum(
        level * math.prod((at - other) / (place - other) for other in places if other != place)
        for place, level in zip(places, levels, strict=True)
    )
