"""Two statements side by side: by how much they differ at each point, and whether that is more than both doubts allow.

What both measurements share (one calibration, one load, one attenuator) is off by the same amount in both, so it leaves
their ratio alone; what they don't share does not.
"""

from collections.abc import Iterator

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.quantity import STATISTICS, Quantity
from wattproof.core.rig import Rig
from wattproof.dsp.intervals import Interval
from wattproof.dsp.sources import ATTENUATOR, INPUT_IMPEDANCE, LOAD, stated95
from wattproof.dsp.uncertainty import ratio
from wattproof.procedures.statement import PowerStatement, StatedRow


@attrs.frozen(eq=False)
class Sitting:
    """A statement with what it was measured by. `name` tells it from others."""

    name: str
    statement: PowerStatement
    rig: Rig
    calibration: Calibration


@attrs.frozen(eq=False)
class Compared:
    """One point in both. `power_ratio` is the second over the first; `interval` its 95 % interval."""

    channel: int
    load_ohm: float
    at: str
    first: Quantity
    second: Quantity
    power_ratio: Quantity
    interval: Interval

    @property
    def differs(self) -> bool:
        """Whether the interval leaves out that both are the same."""
        return not self.interval.low <= 1.0 <= self.interval.high


def compared(first: Sitting, second: Sitting) -> tuple[Compared, ...]:
    """Return every point that both statements have: same channel, same nominal load, same name."""
    return tuple(_points(first, second))


def _points(first: Sitting, second: Sitting) -> Iterator[Compared]:
    for one in first.statement.rows:
        for other in second.statement.rows:
            same = one.row.channel == other.row.channel and one.row.load.nominal_ohm == other.row.load.nominal_ohm
            if same:
                yield from _in_row(first, second, one, other)


def _in_row(first: Sitting, second: Sitting, one: StatedRow, other: StatedRow) -> Iterator[Compared]:
    for point in one.points:
        beside = other.at(point.at)
        if beside is None or point.power_w is None or beside.power_w is None:
            continue
        over = _told_apart(beside.power_w, point.power_w, first, second, one, other)
        found = ratio(over, _of(point.power_w, "first"))
        interval = stated95(found)
        yield Compared(
            one.row.channel, one.row.load.nominal_ohm, point.at, point.power_w, beside.power_w, found, interval
        )


def _of(quantity: Quantity, name: str) -> Quantity:
    parts = (
        attrs.evolve(part, source=f"{STATISTICS} of {name}") if part.source.startswith(STATISTICS) else part
        for part in quantity.parts
    )
    return attrs.evolve(quantity, parts=tuple(parts))


def _told_apart(  # noqa: PLR0913, PLR0917 - both sides of three things
    over: Quantity, under: Quantity, first: Sitting, second: Sitting, one: StatedRow, other: StatedRow
) -> Quantity:
    """Return the second quantity with every source renamed that it does not share with the first."""
    known = {part.source: part.dof for part in under.parts}
    one_socket, other_socket = one.row.wiring.input, other.row.wiring.input
    same_scale = first.calibration.input_vrms(one_socket) == second.calibration.input_vrms(other_socket) and (
        first.calibration.device == second.calibration.device
    )
    same_attenuator = one.row.wiring.attenuator == other.row.wiring.attenuator and one_socket == other_socket
    shared = {LOAD: one.row.load == other.row.load, ATTENUATOR: same_attenuator, INPUT_IMPEDANCE: same_attenuator}
    parts = []
    for part in _of(over, "second").parts:
        is_shared = next((same for start, same in shared.items() if part.source.startswith(start)), same_scale)
        is_same = is_shared and known.get(part.source, part.dof) == part.dof
        parts.append(part if is_same else attrs.evolve(part, source=f"{part.source}, second"))
    return attrs.evolve(over, parts=tuple(parts))
