"""The ratio of a rig's attenuator with its budget: from its resistors and what loads them, or as it was measured."""

import math

import attrs

from wattproof.core.quantity import Part, Quantity
from wattproof.core.rig import Attenuator
from wattproof.dsp.attenuator_leg import Leg
from wattproof.dsp.intervals import rectangular
from wattproof.dsp.sources import ATTENUATOR


def leg_of(attenuator: Attenuator) -> Leg | None:
    """Return the divider of one terminal, or None where its resistors are not stated."""
    upper = tuple(ohm for ohm in (attenuator.r1a_ohm, attenuator.r1b_ohm) if ohm is not None)
    lower = tuple(ohm for ohm in (attenuator.r2a_ohm, attenuator.r2b_ohm) if ohm is not None)
    if not upper or not lower:
        return None
    return Leg(upper, lower, math.inf if attenuator.input_ohm is None else attenuator.input_ohm)


def attenuation(attenuator: Attenuator, name: str, *, bridge_tied: bool = False) -> Quantity:
    """Return volts in over volts out with its budget; `name` is the channel's, so that channels stay apart.

    A measured ratio has the limits of that measurement. Else each resistor and the input's own resistance lie anywhere
    within their tolerance (GUM 4.3.7); a bridge has two such legs, whose parts are independent. A ratio that is stated
    without either is taken as exact, since nothing is known of it.
    """
    source = f"{ATTENUATOR} {name}"
    if attenuator.measured_accuracy is not None:
        u = rectangular(attenuator.measured_accuracy * attenuator.ratio)
        return Quantity(attenuator.ratio, "1", (Part(f"{source} measured", u),))
    leg = leg_of(attenuator)
    if leg is None:
        return Quantity(attenuator.ratio, "1")
    legs = ("+", "-") if bridge_tied else ("",)
    parts = []
    for part, sensitivity in leg.sensitivities():
        if part == "input impedance":
            if attenuator.input_ohm is not None:
                parts.append(Part(f"{source} {part}", -rectangular(_by_input(leg, attenuator.input_tolerance))))
            continue
        u = -leg.ratio * sensitivity * rectangular(attenuator.tolerance) / len(legs)
        parts += [Part(f"{source} {part}{side}", u) for side in legs]
    return Quantity(leg.ratio, "1", tuple(parts))


def _by_input(leg: Leg, tolerance: float) -> float:
    """Return the larger of both ways that the input's tolerance moves the ratio: 20 % less moves it more."""
    ends = (attrs.evolve(leg, input_ohm=leg.input_ohm * (1.0 + sign * tolerance)).ratio for sign in (-1.0, 1.0))
    return max(abs(ratio - leg.ratio) for ratio in ends)


def cable_factor(attenuator: Attenuator, frequency_hz: float) -> float:
    """Return by how much the cable raises the ratio at a frequency: |1 + j2πfRC|, R being R1 ∥ R2 ∥ the input."""
    leg = leg_of(attenuator)
    if leg is None:
        return 1.0
    return math.hypot(1.0, 2.0 * math.pi * frequency_hz * leg.node_ohm * attenuator.cable_pf * 1e-12)
