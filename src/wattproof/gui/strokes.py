"""Draws the kept readings of a power run on the trail: strokes of the hand, or steps in order of level. Pure."""

import math
from bisect import bisect
from collections.abc import Sequence

from wattproof.gui.trail import Key, Stroke, Trail, point_of
from wattproof.procedures.requests import Kept, Mark, Role
from wattproof.procedures.statement import CurveReading


def draw_kept(trail: Trail, kept: Kept, frequency_hz: float) -> None:
    """Add one kept reading to its stroke; what is only held or checked is no part of it."""
    mark, found = kept.mark, point_of(kept.reading)
    if mark is None or mark.role not in (Role.STEP, Role.STROKE):
        return
    if found is None or mark.left_out:
        trail.lift()
        return
    axis, x, y = found
    key = Key(axis, kept.reading.channel, frequency_hz, kept.reading.settings.load_ohm, mark.row, mark.stroke)
    stroke = trail.current
    if stroke is None or stroke.key != key:
        stroke = _begin(trail, key, mark)
    _put(stroke, x, y)
    if stroke.dotted:
        trail.version += 1


def leave_out(trail: Trail, curve: Sequence[CurveReading], row: int) -> None:
    """Draw a row's strokes anew without the readings that were left out of its curve; those become small crosses."""
    own = [each for each in curve if each.number == row]
    out = [each for each in own if each.left_out]
    places = [(found[1], found[2]) for each in out if (found := point_of(each.reading)) is not None]
    if places == trail.left_out:
        return
    trail.left_out = places
    for stroke in (*trail.beside, *([] if trail.current is None else [trail.current])):
        if stroke.dotted or stroke.key.row != row:
            continue
        stroke.x.clear()
        stroke.y.clear()
        for each in own:
            if each.mark.stroke == stroke.key.stroke:
                found = point_of(each.reading)
                usable = found is not None and not each.left_out
                _put(stroke, *(found[1:] if usable and found is not None else (math.nan, math.nan)))
    trail.version += 1


def _begin(trail: Trail, key: Key, mark: Mark) -> Stroke:
    before = trail.current
    if before is not None and before.key.row == key.row and before.key.axis is key.axis:
        trail.beside.append(before)
    else:
        trail.beside, trail.marks, trail.left_out = [], (), []
        trail.earlier = before
    stroke = trail.current = Stroke(key, dotted=mark.role is Role.STEP)
    trail.version += 1
    return stroke


def _put(stroke: Stroke, x: float, y: float) -> None:
    at = bisect(stroke.x, x) if stroke.dotted else len(stroke.x)
    stroke.x.insert(at, x)
    stroke.y.insert(at, y)
