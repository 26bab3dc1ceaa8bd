"""What a statement says of a claim, and which practices that flatter it or the claim show."""

import math
from collections.abc import Sequence
from typing import Protocol

from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading
from wattproof.core.units import db
from wattproof.dsp.power_curve import point_of
from wattproof.procedures.power_plan import ONE_PER_CENT, ONSET, TEN_PER_CENT, PowerPlan
from wattproof.procedures.power_rows import Row

PEAK_OVER_AVERAGE = 2.0  # of a sine's power: closed form
NEAR_PEAK = 0.12  # a claim within this share of twice the 1 % power looks like peak watts
MOMENTARY_FLATTERS = 1.005  # 0.02 dB, and more than twice its uncertainty
SUPPLY_FLATTERS = 1.02  # relative supply from which a claim at another supply is pointed out
_ONE, _TEN = f"{100.0 * ONE_PER_CENT:g} %", f"{100.0 * TEN_PER_CENT:g} %"


class Stated(Protocol):
    """A point of the statement, as far as a verdict looks at it."""

    @property
    def at(self) -> str:
        """The point's name."""
        ...

    @property
    def power_w(self) -> Quantity | None:
        """Power, held where it was held."""
        ...

    @property
    def held_s(self) -> float:
        """How long it was held; 0: momentary."""
        ...

    @property
    def momentary_w(self) -> Quantity | None:
        """Power before it was held."""
        ...


def flattering_notes(plan: PowerPlan, row: Row, points: Sequence[Stated]) -> list[Note]:
    """Return the practices that flatter, where this row or the claim beside it shows them."""
    found: list[Note] = []
    by_name = {point.at: point for point in points}
    found += [_momentary(point) for point in points if _flatters(point)]
    one, ten = _watts(by_name.get(_ONE)), _watts(by_name.get(_TEN))
    if one and ten:
        found.append(note(Kind.FLATTERS_TEN_PER_CENT, ratio=ten / one))
    if len(row.driven) == 1 and any(point.power_w is not None for point in points):
        found.append(note(Kind.FLATTERS_ONE_CHANNEL))
    claimed_w = plan.claimed_w
    if claimed_w is None or not one:
        return found
    if abs(claimed_w / one / PEAK_OVER_AVERAGE - 1.0) < NEAR_PEAK:
        found.append(note(Kind.FLATTERS_PEAK, ratio=claimed_w / one, peak=PEAK_OVER_AVERAGE))
    needed_v = _needed_supply(plan, claimed_w / one)
    if needed_v is not None and plan.supply_v is not None and needed_v > SUPPLY_FLATTERS * plan.supply_v:
        found.append(note(Kind.FLATTERS_SUPPLY, needed_v=needed_v, supply_v=plan.supply_v))
    return found


def claim_notes(plan: PowerPlan, row: Row, points: Sequence[Stated], readings: Sequence[Reading]) -> list[Note]:
    """Return what became of the claimed power: at which THD+N it is reached, what it takes, or that it cannot be."""
    claimed_w = plan.claimed_w
    curve = [point for reading in readings if (point := point_of(reading)) is not None]
    if claimed_w is None or not curve:
        return []
    needed_vrms = math.sqrt(claimed_w * row.load.ohm)
    above = [point for point in curve if point.voltage_vrms >= needed_vrms]
    if above:
        percent = 100.0 * min(above, key=lambda point: point.voltage_vrms).thdn
        kind = Kind.CLAIM_MET if percent <= 100.0 * ONE_PER_CENT else Kind.CLAIM_AT_MORE
        return [_reached(kind, claimed_w, percent)]
    most_w = _square_wave_w(readings, row)
    clipped = any(point.at == ONSET and point.power_w is not None for point in points)
    if clipped and most_w is not None and claimed_w > most_w:
        return [note(Kind.CLAIM_IMPOSSIBLE, claimed_w=claimed_w, vrms=needed_vrms, most_w=most_w)]
    beyond = needed_vrms / max(point.voltage_vrms for point in curve)
    return [note(Kind.CLAIM_MISSED, claimed_w=claimed_w, vrms=needed_vrms, db=db(beyond), ratio=beyond**2)]


def _reached(kind: Kind, claimed_w: float, percent: float) -> Note:
    if kind is Kind.CLAIM_MET:
        return note(Kind.CLAIM_MET, claimed_w=claimed_w, percent=percent)
    return note(Kind.CLAIM_AT_MORE, claimed_w=claimed_w, percent=percent)


def _flatters(point: Stated) -> bool:
    held, momentary = point.power_w, point.momentary_w
    if point.held_s == 0.0 or held is None or momentary is None or held.value <= 0.0:
        return False
    excess = momentary.value / held.value - 1.0
    return excess > max(MOMENTARY_FLATTERS - 1.0, 2.0 * momentary.u / momentary.value)


def _momentary(point: Stated) -> Note:
    return note(Kind.FLATTERS_MOMENTARY, named=point.at, ratio=_watts_of(point.momentary_w) / _watts_of(point.power_w))


def _watts(point: Stated | None) -> float:
    return 0.0 if point is None else _watts_of(point.power_w)


def _watts_of(quantity: Quantity | None) -> float:
    return 0.0 if quantity is None else quantity.value


def _needed_supply(plan: PowerPlan, times: float) -> float | None:
    """Return the supply that a claim names, or that its power needs where swing goes with supply; None: not known."""
    if plan.claimed_supply_v is not None:
        return plan.claimed_supply_v
    return plan.supply_v * math.sqrt(times) if plan.supply_v is not None and times > 1.0 else None


def _square_wave_w(readings: Sequence[Reading], row: Row) -> float | None:
    """Return the power of a square wave as high as the highest peak that was read."""
    peaks = [
        reading.crest_factor.value * reading.level_vrms.value
        for reading in readings
        if reading.crest_factor is not None and reading.level_vrms is not None
    ]
    return max(peaks) ** 2 / row.load.ohm if peaks else None
