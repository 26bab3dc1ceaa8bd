"""The curve of THD+N against output voltage: which readings belong to it, and at which voltage it passes a value.

A crossing is placed in log-log between the two readings around it. What the curve leaves uncertain of it is kept: the
scatter of the readings, the bend of the curve between them, the averaging of a block while the level moves, and half
the difference between a stroke up and one down.
"""

import math
from collections.abc import Sequence
from enum import StrEnum

import attrs
import numpy as np

from wattproof.core.notes import Kind
from wattproof.core.reading import Reading, State
from wattproof.core.signal import Samples
from wattproof.core.units import DB_PER_RELATIVE
from wattproof.dsp.onset import Curve

# A block that moves by m dB of output averages a curve that bends upwards: its THD+N is that of a level higher by
# c·s·m² dB, with s = d ln THD+N per dB. By closed form c is 1/18 for a curve that grows as a power of 1.5 beyond the
# onset, 1/12 for an exponential one; our own measurement with the live reading, whose harmonics stand still within a
# block, gives 0.08 to 0.2. The middle is put back, and the half width is what stays uncertain.
MOVING_BIAS = 0.12
MOVING_BIAS_HALF_WIDTH = 0.10
JUMP_DB = 3.0  # from one block to the next, more than a hand turns within 0.1 s
STANDS_OUT = 1.5  # a residual this far above all of one side's neighbours on both sides belongs to the control
NEIGHBOURS = 6
_JOINED_RELATIVE = 1.2e-4  # 0.001 dB: readings this near in voltage are one point of the curve
_SAME_TIME_S = 0.1
_SLOPE_REACH = 1.4
_LEAST_SLOPE = 0.3  # flatter than that nothing is carried along a curve
_LEAST_RISE = 0.02  # of ln THD+N from reading to reading, below which a parabola would follow their scatter
_DOMINANT = 2.0  # 3 dB of power: below that neither is called the larger


class Dominated(StrEnum):
    """What the larger part of a reading's THD+N is."""

    NOISE = "noise"
    HARMONICS = "harmonics"
    BOTH = "both"


class LeftOut(StrEnum):
    """Why a block does not belong to the curve."""

    JUMP = "jump"
    CRACKLE = "crackle"


@attrs.frozen
class Point:
    """One reading on the curve. Ratios are plain; `moved_db` is what the level moved within the block, signed."""

    voltage_vrms: float
    thdn: float
    u_thdn: float
    thd: float
    noise: float  # hum included
    moved_db: float
    start_s: float
    seconds: float
    stroke: int = 0

    @property
    def residual_vrms(self) -> float:
        """What THD+N is made of, in V."""
        return self.voltage_vrms * self.thdn

    @property
    def dominated(self) -> Dominated:
        """What the larger part of THD+N is."""
        harmonics, rest = self.thd**2, self.noise**2
        if rest > _DOMINANT * harmonics:
            return Dominated.NOISE
        return Dominated.HARMONICS if harmonics > _DOMINANT * rest else Dominated.BOTH


@attrs.frozen
class Crossing:
    """Where a curve passes a stated THD+N: the voltage and the standard uncertainty that the curve gives it, V rms.

    `slope` is d ln THD+N / d ln U there.
    """

    thdn: float
    voltage_vrms: float
    u_vrms: float
    slope: float


def point_of(reading: Reading, stroke: int = 0) -> Point | None:
    """Return a reading as a point of a curve, or None where it has no voltage or no THD+N."""
    if reading.state is not State.OK or reading.level_vrms is None or reading.thdn is None:
        return None
    if reading.level_vrms.value <= 0.0 or reading.thdn.value <= 0.0:
        return None
    thd = 0.0 if reading.thd is None else reading.thd.value
    rest = math.hypot(*(part.value for part in (reading.noise, reading.hum) if part is not None))
    moved = next((dict(note.values)["db"] for note in reading.notes if note.kind is Kind.LEVEL_MOVES), 0.0)
    return Point(
        voltage_vrms=reading.level_vrms.value,
        thdn=reading.thdn.value,
        u_thdn=reading.thdn.u,
        thd=thd,
        noise=rest,
        moved_db=float(moved),
        start_s=reading.span.start_s,
        seconds=reading.span.seconds,
        stroke=stroke,
    )


def left_out(points: Sequence[Point]) -> dict[int, LeftOut]:
    """Return which points of strokes in the order of time are no curve but a scratchy control, and why.

    A jump: the level steps by more than a hand turns. A crackle: a residual that stands out on both sides in time.
    """
    found: dict[int, LeftOut] = {}
    residuals = np.array([point.residual_vrms for point in points])
    for index, point in enumerate(points):
        before = _near(points, range(index - 1, index - NEIGHBOURS - 1, -1), index)
        after = _near(points, range(index + 1, index + NEIGHBOURS + 1), index)
        if not before or not after:
            continue
        steps = [
            abs(_db_apart(points[other], point)) - _may_move(points[other], point) for other in (before[0], after[0])
        ]
        if min(steps) > JUMP_DB:
            found[index] = LeftOut.JUMP
        elif residuals[index] > STANDS_OUT * max(residuals[before].min(), residuals[after].min()):
            found[index] = LeftOut.CRACKLE
    return found


def _near(points: Sequence[Point], indices: range, to: int) -> list[int]:
    return [i for i in indices if 0 <= i < len(points) and points[i].stroke == points[to].stroke]


def _db_apart(first: Point, second: Point) -> float:
    return DB_PER_RELATIVE * math.log(second.voltage_vrms / first.voltage_vrms)


def _may_move(first: Point, second: Point) -> float:
    """Return by how many dB the level may have moved from one block to the other at the rate that both had."""
    rate = max(abs(point.moved_db) / point.seconds for point in (first, second))
    return rate * abs(second.start_s - first.start_s)


def curve_of(points: Sequence[Point]) -> Curve:
    """Return points as one curve of rising voltage; those within 0.001 dB are joined by their mean."""
    ordered = sorted(points, key=lambda point: point.voltage_vrms)
    groups: list[list[Point]] = []
    for point in ordered:
        if groups and point.voltage_vrms <= groups[-1][0].voltage_vrms * (1.0 + _JOINED_RELATIVE):
            groups[-1].append(point)
        else:
            groups.append([point])
    return Curve(
        np.array([np.mean([point.voltage_vrms for point in group]) for group in groups]),
        np.array([np.sqrt(np.mean([point.thdn**2 for point in group])) for group in groups]),
        np.array([np.sqrt(np.sum([point.u_thdn**2 for point in group])) / len(group) for group in groups]),
    )


def crossing_of(points: Sequence[Point], wanted: float) -> Crossing | None:
    """Return the highest voltage at which THD+N rises through a value, over all strokes, or None where none does.

    Half the difference between the strokes' own crossings is part of the uncertainty; the value is their mean.
    """
    strokes = sorted({point.stroke for point in points})
    each = [_crossing_in([point for point in points if point.stroke == stroke], wanted) for stroke in strokes]
    found = [crossing for crossing in each if crossing is not None]
    if not found:
        return None
    voltages = [crossing.voltage_vrms for crossing in found]
    own = math.sqrt(sum(crossing.u_vrms**2 for crossing in found)) / len(found)
    half = (max(voltages) - min(voltages)) / 2.0
    slope = sum(crossing.slope for crossing in found) / len(found)
    return Crossing(wanted, sum(voltages) / len(voltages), math.hypot(own, half), slope)


def _crossing_in(points: Sequence[Point], wanted: float) -> Crossing | None:
    ordered = sorted(points, key=lambda point: point.voltage_vrms)
    pairs = [
        index
        for index in range(1, len(ordered))
        if ordered[index - 1].thdn < wanted <= ordered[index].thdn
        and ordered[index].voltage_vrms > ordered[index - 1].voltage_vrms
    ]
    if not pairs:
        return None
    top = pairs[-1]
    log_u = np.log([point.voltage_vrms for point in ordered])
    log_d = np.log([point.thdn for point in ordered])
    slope = float((log_d[top] - log_d[top - 1]) / (log_u[top] - log_u[top - 1]))
    share = (math.log(wanted) - log_d[top - 1]) / (log_d[top] - log_d[top - 1])
    straight = float(log_u[top - 1] + share * (log_u[top] - log_u[top - 1]))
    bent = _bent(log_u, log_d, top, math.log(wanted))
    bend = 0.0 if bent is None else abs(bent - straight)
    pair = ordered[top - 1 : top + 1]
    scatter = math.sqrt(sum((point.u_thdn / point.thdn) ** 2 for point in pair) / 2.0) / slope
    rise = _slope(log_u, log_d, top, wanted)
    moved = sum(point.moved_db**2 for point in pair) / 2.0 * rise / DB_PER_RELATIVE**2
    averaged, raised = MOVING_BIAS_HALF_WIDTH / math.sqrt(3.0) * moved, MOVING_BIAS * moved
    voltage = math.exp((straight if bent is None else bent) + raised)
    return Crossing(
        wanted, voltage, voltage * math.hypot(scatter, 0.5 * bend, averaged), _slope(log_u, log_d, top, wanted)
    )


def _slope(log_u: Samples, log_d: Samples, top: int, wanted: float) -> float:
    """Return d ln THD+N / d ln U near a crossing: over the readings within a factor of 1.4, at least the two around it.

    Two readings of one drive, taken before and after a supply settled, would give any slope.
    """
    low, high = top - 1, top
    while low > 0 and log_d[low] > math.log(wanted / _SLOPE_REACH):
        low -= 1
    while high < log_d.size - 1 and log_d[high] < math.log(wanted * _SLOPE_REACH):
        high += 1
    return max(float((log_d[high] - log_d[low]) / (log_u[high] - log_u[low])), _LEAST_SLOPE)


def _bent(log_u: Samples, log_d: Samples, top: int, wanted: float) -> float | None:
    """Return the crossing on the parabola through the two readings around it and the next one above.

    Above a clipping amplifier's onset the curve is smooth, below it is not: one more reading from there makes it worse
    (our own measurement). None where the readings do not rise over all three, or it leaves the two.
    """
    part = slice(top - 1, top + 2)
    d, u = log_d[part], log_u[part]
    if d.size < 3 or np.any(np.diff(d) <= _LEAST_RISE) or np.any(np.diff(u) <= 0.0):
        return None
    inside = float(np.polyfit(d - wanted, u, 2)[-1])
    return inside if log_u[top - 1] <= inside <= log_u[top] else None
