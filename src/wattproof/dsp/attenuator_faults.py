"""What every single part, open or short, does to the input and to the parts that are left."""

import math

import attrs

from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_leg import Kind, Leg, single_faults


@attrs.frozen
class Fault:
    """One failed part, a terminal at its rail, every other part at that end of its tolerance that lets most through.

    `level_vrms` is at the input at full power; `pin_v` is at the pin with the terminal at the rail, and so the most
    between the pins; `input_ma` flows into the input's resistance, `shorted_ma` into an input that is taken as a short,
    as its own protection would be. `most_energy_j` is the most that any input can draw in one second: the power that
    matching would bring (V²/4R). `heat_share` and `voltage_share` are of the rating of the part that is worst off.
    """

    part: str
    kind: Kind
    level_vrms: float
    pin_v: float
    limit_v: float
    input_ma: float
    shorted_ma: float
    limit_ma: float
    most_energy_j: float
    heat_share: float
    voltage_share: float

    @property
    def harmless(self) -> bool:
        """Whether input and parts stay within their limits."""
        input_is_safe = self.pin_v <= self.limit_v and self.shorted_ma <= self.limit_ma
        return input_is_safe and self.heat_share <= 1.0 and self.voltage_share <= 1.0


def faults(plan: Plan) -> tuple[Fault, ...]:
    """Return every single fault of one leg; a bridge's other leg does the same."""
    tolerance = plan.wish.part_tolerance
    shared = {(name, kind): left for name, kind, left in single_faults(plan.shared_leg)}
    return tuple(
        _fault(plan, name, kind, left, shared[name, kind].toleranced(tolerance, plan.wish.input_tolerance, most=True))
        for name, kind, left in single_faults(plan.leg)
    )


def _fault(plan: Plan, name: str, kind: Kind, left: Leg, worst: Leg) -> Fault:
    wish = plan.wish
    pin_v = wish.rail * worst.gain
    level_gain = (left.gain + plan.leg.gain) / 2.0 if wish.is_balanced else left.gain
    unloaded = attrs.evolve(worst, input_ohm=math.inf)
    heat, voltages = dict(worst.heat(wish.rail)), dict(worst.voltages(wish.rail))
    return Fault(
        part=name,
        kind=kind,
        level_vrms=wish.seen_vrms * level_gain,
        pin_v=pin_v,
        limit_v=wish.pin_limit_v,
        input_ma=1e3 * pin_v / (wish.pin_ohm * (1.0 - wish.input_tolerance)),
        shorted_ma=0.0 if worst.loaded_ohm == 0.0 else 1e3 * wish.rail / worst.series_ohm,
        limit_ma=wish.input_limit_ma,
        most_energy_j=_matched_w(wish.rail * unloaded.gain, worst.source_ohm),
        heat_share=max(heat[part.name] / part.rated_w for part in plan.parts),
        voltage_share=max(voltages[part.name] / part.rated_v for part in plan.parts),
    )


def _matched_w(open_v: float, source_ohm: float) -> float:
    return open_v * open_v / (4.0 * source_ohm) if open_v else 0.0
