"""Plans an attenuator between an amplifier's output and an input: which resistors, what level, what heat.

Every single part may fail open or short without the input seeing more than its limit: the two halves of R1 are equal,
and so are those of R2, so one fault at most doubles what comes through, and twice is kept free.
"""

import math

import attrs

from wattproof.core.quantity import Part as BudgetPart
from wattproof.core.quantity import Quantity
from wattproof.dsp.attenuator_leg import Leg, parallel, single_faults
from wattproof.dsp.attenuator_wish import Wish
from wattproof.dsp.eseries import at_most, between
from wattproof.dsp.intervals import rectangular

SPARE = 2.0  # one failed part of four equal halves at most doubles what comes through (computed)
LEAST_RATIO = 2.0  # an input that would stand the amplifier directly still gets a series resistor
_LARGEST_INPUT_SHARE = 0.1  # of the input's own resistance; its stated value is seldom exact
_LEAST_OVER_LOAD = 25.0  # each half of R1 over the load: all four parts then take less than 2 % of what the load takes
_R1_REACH = 3.0  # how far above its least value R1 is looked for
_FAULT_W = 2.0  # most in one part after another failed: the largest precision parts that are common
_NOISE_DB_PER_OCTAVE = 10.0 * math.log10(2.0)  # thermal noise power grows with the resistance
# W and V of film resistors as commonly sold; common practice, no source: the maker's data sheet decides
_RATINGS = ((0.25, 200.0), (0.6, 350.0), (1.0, 350.0), (2.0, 500.0), (3.0, 750.0))


@attrs.frozen
class PlannedPart:
    """One resistor: its value, what it bears in use and after the worst single fault, and the rating it takes.

    `running_w` is at full power, `running_v` and both figures of a fault with the terminal at its rail.
    """

    name: str
    ohm: float
    running_w: float
    running_v: float
    fault_w: float
    fault_v: float
    rated_w: float
    rated_v: float


@attrs.frozen
class Plan:
    """An attenuator: one leg, used once (single-ended) or twice (bridge-tied, one for each terminal)."""

    wish: Wish
    leg: Leg
    parts: tuple[PlannedPart, ...]

    @property
    def shared_leg(self) -> Leg:
        """The leg as it treats a voltage that both terminals share, or that one of them takes alone."""
        return _shared(self.leg, self.wish)

    @property
    def level_vrms(self) -> float:
        """The level at an input at full power, V rms; between the pins where it is balanced."""
        return self.wish.seen_vrms * self.leg.gain

    @property
    def with_attenuator_ohm(self) -> float:
        """What the amplifier drives: the load with the attenuator across it."""
        legs = 2.0 if self.wish.bridge_tied else 1.0
        return parallel((self.wish.load_ohm, legs * (self.leg.series_ohm + self.leg.loaded_ohm)))

    @property
    def headroom(self) -> float:
        """Full scale over the level at full power, as a plain ratio."""
        return self.wish.full_scale_vrms / self.level_vrms

    def extremes(self) -> tuple[float, float]:
        """Return the least and the greatest ratio that the tolerances allow."""
        return _extremes(self.leg, self.wish)

    def ratio(self) -> Quantity:
        """Return volts in over volts out with its budget: each part and the input, rectangular (GUM 4.3.7).

        The parts of a bridge's two legs are taken as independent; their input impedance is one.
        """
        legs = ("+", "-") if self.wish.bridge_tied else ("",)
        value = self.leg.ratio
        parts = []
        for name, sensitivity in self.leg.sensitivities():
            if name == "input impedance":
                parts.append(BudgetPart(name, -value * sensitivity * rectangular(self.wish.input_tolerance)))
                continue
            u = -value * sensitivity * rectangular(self.wish.part_tolerance) / len(legs)
            parts += [BudgetPart(f"attenuator {name}{leg}", u) for leg in legs]
        return Quantity(value, "1", tuple(parts))


def plan(wish: Wish) -> Plan:
    """Return the attenuator that loses least: signal beyond what safety needs, and thermal noise, both counted in dB.

    Raises:
        ValueError: no such attenuator; the text says what to change.
    """
    if wish.rail > _RATINGS[-1][1]:
        raise ValueError(
            f"power {wish.power_w:g} W into load {wish.load_ohm:g} Ω puts {wish.rail:.4g} V on one resistor after a "
            f"fault, and they stand {_RATINGS[-1][1]:g} V; use a high-voltage probe made for it, or give less power"
        )
    target = max(SPARE * wish.seen_vrms / wish.full_scale_vrms, _least_shared_ratio(wish), LEAST_RATIO)
    least_by_fault = max(wish.rail / (wish.input_limit_ma / 1e3), wish.rail**2 / _FAULT_W)
    least_r1 = max(least_by_fault / (1.0 - wish.part_tolerance), _LEAST_OVER_LOAD * wish.load_ohm)
    found = []
    for r1 in between(wish.series, least_r1, _R1_REACH * least_r1):
        leg = _leg(r1, target, wish)
        if leg is not None:
            excess_db = 20.0 * math.log10(_extremes(leg, wish)[0] / target)
            found.append((excess_db + _NOISE_DB_PER_OCTAVE * math.log2(r1 / least_r1), r1, leg))
    if not found:
        raise ValueError(
            f"no {wish.series.value} pair takes {wish.full_vrms:.4g} V down to full scale {wish.full_scale_vrms:g} V "
            f"at input impedance {wish.input_ohm:g} Ω; use an input of higher impedance or of higher full scale"
        )
    leg = min(found, key=lambda entry: entry[:2])[2]
    return Plan(wish, leg, _rated(leg, wish))


def _leg(r1: float, target: float, wish: Wish) -> Leg | None:
    """Return the leg with R1 = 2·r1 and the largest R2 whose least ratio still reaches the target."""
    loaded = min(2.0 * r1 / (target - 1.0), wish.pin_ohm * _LARGEST_INPUT_SHARE)
    wanted = 2.0 / (1.0 / loaded - 1.0 / wish.pin_ohm)
    r2 = at_most(wish.series, wanted)
    while r2 is not None:
        leg = Leg((r1, r1), (r2, r2), wish.pin_ohm)
        shared = _shared(leg, wish).toleranced(wish.part_tolerance, wish.input_tolerance, most=True)
        if shared.ratio >= _least_shared_ratio(wish) and _extremes(leg, wish)[0] >= target:
            return leg
        r2 = at_most(wish.series, r2 * (1.0 - 1e-9))
    return None


def _shared(leg: Leg, wish: Wish) -> Leg:
    return attrs.evolve(leg, input_ohm=wish.shared_pin_ohm)


def _least_shared_ratio(wish: Wish) -> float:
    return SPARE * wish.rail / wish.pin_limit_v


def _extremes(leg: Leg, wish: Wish) -> tuple[float, float]:
    tolerances = (wish.part_tolerance, wish.input_tolerance)
    return leg.toleranced(*tolerances, most=True).ratio, leg.toleranced(*tolerances, most=False).ratio


def _rated(leg: Leg, wish: Wish) -> tuple[PlannedPart, ...]:
    """Return the parts with ratings that outlast any single fault; in use they then bear less than half."""
    running_w = dict(leg.heat(wish.running_vrms))
    running_v = dict(leg.voltages(wish.rail))
    tolerances = (wish.part_tolerance, wish.input_tolerance)
    faults = [left.toleranced(*tolerances, most=True) for _, _, left in single_faults(_shared(leg, wish))]
    ohms = dict(zip(running_w, (*leg.upper_ohm, *leg.lower_ohm), strict=True))
    parts = []
    for name, ohm in ohms.items():
        fault_w = max(dict(left.heat(wish.rail))[name] for left in faults)
        fault_v = max(dict(left.voltages(wish.rail))[name] for left in faults)
        rated_w, rated_v = next(rating for rating in _RATINGS if fault_w <= rating[0] and fault_v <= rating[1])
        parts.append(PlannedPart(name, ohm, running_w[name], running_v[name], fault_w, fault_v, rated_w, rated_v))
    return tuple(parts)
