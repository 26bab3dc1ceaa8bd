"""What the interface itself puts into a reading: |out| + |in| for each harmonic, and its noise, at the levels in use.

One loop alone bounds nothing, since the two converters partly cancel in it; kept apart, their sum does. Within the
levels of the calibration the bound follows the order-k law as far as the levels bear it out, else the larger neighbour
counts; above the highest level it is the law times 2. What lies outside the levels is marked as extrapolated.
"""

import math
from collections.abc import Sequence

import attrs

from wattproof.core.calibration import Calibration, Floor
from wattproof.core.quantity import Part, Quantity
from wattproof.core.rig import Wiring
from wattproof.dsp.intervals import rectangular
from wattproof.dsp.sources import FLOOR_NOISE

COVERAGE = 2.0  # a bound carries 2u
BEYOND = 2.0  # the level law, held by no measurement, is given twice
_SAME = 1.001  # levels within 0.01 dB are one
_SURE = 3.0  # a product this many u above the law breaks it: chance e^−4.5 each


@attrs.frozen
class Bound:
    """The most that one converter adds of one order, as a ratio to the fundamental."""

    ratio: float
    extrapolated: bool


@attrs.frozen
class OwnLine:
    """The most that both converters add to one harmonic, as a ratio to the fundamental."""

    order: int
    out: Bound
    into: Bound

    @property
    def ratio(self) -> float:
        """|out| + |in|."""
        return self.out.ratio + self.into.ratio

    @property
    def extrapolated(self) -> bool:
        """Whether either part lies beyond the levels that were measured."""
        return self.out.extrapolated or self.into.extrapolated


@attrs.frozen
class Levels:
    """Where a reading stands: the fundamental at the input, and the drive where it is known, both to full scale."""

    input_fs: float
    drive_fs: float | None = None


def own_lines(calibration: Calibration, wiring: Wiring, levels: Levels) -> dict[int, OwnLine]:
    """Return the bound of each order that the calibration knows; nothing where it separated no converters.

    A drive that is not known is taken as the worst of those that were measured.
    """
    out = _of(calibration.out_floors, wiring.output)
    into = _of(calibration.in_floors, wiring.input)
    orders = _orders(out) & _orders(into)
    return {
        order: OwnLine(order, _out_bound(out, order, levels.drive_fs), bound_at(into, order, levels.input_fs))
        for order in sorted(orders)
    }


def bound_at(floors: Sequence[Floor], order: int, level_fs: float) -> Bound:
    """Return what one converter adds at most at a level, from its floors in rising order of level.

    The level law carries the bound down from the level that tells most of it, as long as no level on the way stands
    above that law by more than its noise; else the larger neighbour counts.
    """
    known = [_at(floor, order) for floor in floors if _has(floor, order)]
    top, lowest = known[-1], known[0]
    if level_fs > top.level_fs * _SAME:
        return Bound(BEYOND * top.upper * (level_fs / top.level_fs) ** (order - 1), extrapolated=True)
    beyond = level_fs < lowest.level_fs / _SAME
    above = [each for each in known if each.level_fs >= level_fs / _SAME]
    best = min(above, key=lambda each: each.u * (level_fs / each.level_fs) ** (order - 1))
    if all(each.obeys(best, order) for each in known if each.level_fs < best.level_fs):
        return Bound(best.upper * min(level_fs / best.level_fs, 1.0) ** (order - 1), extrapolated=beyond)
    below = [each for each in known if each.level_fs <= level_fs * _SAME]
    return Bound(max(each.upper for each in (*below[-1:], above[0])), extrapolated=beyond)


@attrs.frozen
class _At:
    """One converter's product of one order at one level."""

    level_fs: float
    ratio: float
    u: float

    @property
    def upper(self) -> float:
        return self.ratio + COVERAGE * self.u

    def obeys(self, other: "_At", order: int) -> bool:
        """Return whether it stands no higher than the level law from the other one allows, but for its noise."""
        return self.ratio - _SURE * self.u <= other.upper * (self.level_fs / other.level_fs) ** (order - 1)


def own_noise(calibration: Calibration, wiring: Wiring, levels: Levels) -> Quantity | None:
    """Return the interface's noise at the input in the calibration's band, rms to full scale; None where unknown.

    The converter-out's is carried through the amplifier together with the tone, so it keeps its ratio to it; where the
    drive is not known, only the converter-in's is counted.
    """
    into = _of(calibration.in_floors, wiring.input)
    out = _of(calibration.out_floors, wiring.output)
    if not into:
        return None
    own_in = _noise_at(into, levels.input_fs, f"{FLOOR_NOISE} in {wiring.input}")
    if not out or not levels.drive_fs:
        return own_in
    carried = levels.input_fs / levels.drive_fs
    own_out = _noise_at(out, levels.drive_fs, f"{FLOOR_NOISE} out {wiring.output}").scaled(carried, "1")
    value = math.hypot(own_in.value, own_out.value)
    if value == 0.0:
        return attrs.evolve(own_in, parts=(*own_in.parts, *own_out.parts))
    parts = [attrs.evolve(part, u=part.u * own_in.value / value) for part in own_in.parts]
    parts += [attrs.evolve(part, u=part.u * own_out.value / value) for part in own_out.parts]
    return Quantity(value, "1", tuple(parts))


def _out_bound(floors: Sequence[Floor], order: int, drive_fs: float | None) -> Bound:
    if drive_fs:
        return bound_at(floors, order, drive_fs)
    levels = [floor.level_fs for floor in floors if _has(floor, order)]
    return Bound(max(bound_at(floors, order, level).ratio for level in levels), extrapolated=False)


def _noise_at(floors: Sequence[Floor], level_fs: float, source: str) -> Quantity:
    """Return the noise between the two levels around level_fs; how far they differ is an uncertainty."""
    above = next((floor for floor in floors if floor.level_fs >= level_fs), floors[-1])
    below = next((floor for floor in reversed(floors) if floor.level_fs <= level_fs), floors[0])
    value = (above.noise_fs.value + below.noise_fs.value) / 2.0
    half = abs(above.noise_fs.value - below.noise_fs.value) / 2.0
    u = math.hypot(max(above.noise_fs.u, below.noise_fs.u), rectangular(half))
    return Quantity(value, "1", (Part(source, u),))


def _of(floors: Sequence[Floor], socket: int) -> list[Floor]:
    return sorted((floor for floor in floors if floor.socket == socket), key=lambda floor: floor.level_fs)


def _orders(floors: Sequence[Floor]) -> set[int]:
    return {order for floor in floors for order, _ in floor.harmonics}


def _has(floor: Floor, order: int) -> bool:
    return any(known == order for known, _ in floor.harmonics)


def _at(floor: Floor, order: int) -> _At:
    quantity = next(quantity for known, quantity in floor.harmonics if known == order)
    return _At(floor.level_fs, quantity.value, quantity.u)
