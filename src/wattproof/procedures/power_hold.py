"""Holding a point: the drive is trimmed until THD+N stands at its value, then left alone for the time asked."""

import math

import attrs

from wattproof.core.notes import Kind, note
from wattproof.core.reading import Reading
from wattproof.procedures.driving import Doing, Driving
from wattproof.procedures.power_search import Bracket, Search
from wattproof.procedures.requests import Mark, Role, Said

TRIMS = 16
TRIM_S = 0.4
TRIM_SETTLE_S = 0.2
SETTLED = 0.0006  # 0.005 dB of level by which the drive may miss the point when trimming ends, twice in a row
DRIFTED = 0.003  # 0.026 dB of level at the end of a hold from which it is trimmed and held once more
HELD_READING_S = 1.0
_INSIDE = 0.1  # of a bracket: the next drive stays this far from both ends
_STUCK = 2e-4  # log width of a bracket that holds its point no more: the supply has moved on
_WIDENED = 0.01  # by how much its lower end then goes down: 0.09 dB
_HELD_TO_S = 1e-6


@attrs.frozen
class Held:
    """A point to hold: its name and the THD+N at which it stands, as a plain ratio."""

    name: str
    thdn: float


def hold(driving: Driving, search: Search, held: Held, share: float) -> Doing[None]:
    """Hold one point for the plan's time; its readings are kept as held. `share` is how far the procedure is.

    Raises:
        Muted: the guard silenced the tone.
    """
    bracket = search.bracket(held.thdn)
    if bracket is None:
        return
    for attempt in range(2):
        bracket = yield from _trimmed(driving, held.thdn, bracket)
        reading = driving.last
        if reading is not None and (part := driving.heat_allows(reading, driving.plan.hold_s)):
            yield Said(note(Kind.HEAT_REACHED, what=part), driving.row.index)
            return
        miss = yield from _held(driving, held, share)
        if abs(miss / bracket.slope) < DRIFTED or attempt:
            return


def _trimmed(driving: Driving, thdn: float, bracket: Bracket) -> Doing[Bracket]:
    """Bring the drive to where THD+N stands at its value, by the secant inside a bracket that follows the supply."""
    near, level_fs = 0, driving.level_fs
    for _ in range(TRIMS):
        if not near:
            level_fs = min(bracket.drive_at(thdn, _INSIDE), driving.ceiling_fs)
        yield from driving.sound(level_fs)
        reading = yield from driving.look(TRIM_S, TRIM_SETTLE_S)
        miss = _miss(reading, thdn)
        near = near + 1 if abs(miss / bracket.slope) < SETTLED else 0
        if near == 2:
            break
        if not near:
            bracket = bracket.narrowed(level_fs, thdn * math.exp(miss), thdn)
            if bracket.width < _STUCK:
                bracket = bracket.widened(_WIDENED)
    return bracket


def _held(driving: Driving, held: Held, share: float) -> Doing[float]:
    """Hold the drive as it is, and return by how much THD+N misses its value at the end (log ratio)."""
    held_s, hold_s, miss = 0.0, driving.plan.hold_s, 0.0
    while held_s < hold_s - _HELD_TO_S:
        seconds = min(HELD_READING_S, max(hold_s - held_s, 0.1))
        yield driving.progress(share, hold_s - held_s, note(Kind.HOLDING, named=held.name, left_s=hold_s - held_s))
        mark = Mark(Role.HELD, at=held.name, held_s=held_s + seconds)
        reading = yield from driving.read(seconds, 0.0, mark)
        held_s += seconds
        miss = _miss(reading, held.thdn)
    return miss


def _miss(reading: Reading, thdn: float) -> float:
    """Return the log ratio of THD+N to its value; that of a tenth where it was not read."""
    if reading.thdn is None or reading.thdn.value <= 0.0:
        return -1.0
    return math.log(reading.thdn.value / thdn)
