"""Which kept readings a power statement rests on: those at its points and beside them, and whatever was held."""

import math
from collections.abc import Sequence

from wattproof.procedures.power_plan import PowerPlan
from wattproof.procedures.power_rows import Row
from wattproof.procedures.requests import Kept, Role
from wattproof.procedures.statement import StatedPoint, conclude

BESIDE = 2  # readings on each side of a point: the curve is bent through the two around it and one more on each side


def evidence(plan: PowerPlan, rows: Sequence[Row], kept: Sequence[Kept]) -> frozenset[int]:
    """Return which readings, by their place in the order they were kept, carry the statement."""
    needed = {index for index, each in enumerate(kept) if each.mark and each.mark.role in {Role.HELD, Role.CHECK}}
    for stated in conclude(plan, rows, kept).rows:
        strokes: dict[int, list[tuple[float, int]]] = {}
        for index, each in enumerate(kept):
            mark, volts = each.mark, each.reading.level_vrms
            if mark is None or mark.row != stated.row.index or index in needed or volts is None or volts.value <= 0.0:
                continue
            strokes.setdefault(mark.stroke, []).append((volts.value, index))
        for point in stated.points:
            for stroke in strokes.values():
                needed |= _around(point, stroke)
    return frozenset(needed)


def _around(point: StatedPoint, stroke: list[tuple[float, int]]) -> set[int]:
    found: set[int] = set()
    for stated in (point.voltage_vrms, point.momentary_vrms):
        if stated is not None and stated.value > 0.0:
            nearest = sorted(stroke, key=lambda each: abs(math.log(each[0] / stated.value)))
            below = [index for volts, index in nearest if volts < stated.value][:BESIDE]
            found |= {*below, *[index for volts, index in nearest if volts >= stated.value][:BESIDE]}
    return found
