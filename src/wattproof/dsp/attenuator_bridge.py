"""What a bridge-tied output adds: the voltage that both terminals share, and how well the two legs cancel it."""

import math

import attrs

from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_leg import Leg
from wattproof.dsp.intervals import rectangular


@attrs.frozen
class CommonMode:
    """Volts at one pin against ground: at rest and running, at switch-on, with one half stuck at the rail.

    `running_v` is DC and `swing_v` the sine's peak about it at full power. At switch-on both terminals step to half the
    rail: an input that blocks DC sees the step and lets it fall again. With one half at the rail and the other at
    ground `stuck_v` stands at one pin and between both.
    """

    running_v: float
    swing_v: float
    switch_on_v: float
    stuck_v: float
    limit_v: float


def common_mode(plan: Plan) -> CommonMode:
    """Return the voltages of one pin against ground; a balanced input is taken to load the swing alone."""
    gain, rail = plan.shared_leg.gain, plan.wish.rail
    return CommonMode(
        running_v=rail / 2.0 * gain,
        swing_v=plan.wish.terminal_peak_v / 2.0 * plan.leg.gain,
        switch_on_v=rail / 2.0 * gain,
        stuck_v=rail * gain,
        limit_v=plan.wish.pin_limit_v,
    )


@attrs.frozen
class Rejection:
    """How much of a voltage that both terminals share is kept out, as plain ratios: the worst case, and by standard u.

    `hum_*_vrms` is what remains of the shared hum, referred to the amplifier's terminals; `hum_*` the same to full
    power.
    """

    worst: float
    standard: float
    hum_worst_vrms: float
    hum_standard_vrms: float
    hum_worst: float
    hum_standard: float


def rejection(plan: Plan, tolerance: float | None = None) -> Rejection:
    """Return the rejection that the parts' tolerances leave, theirs as planned or another.

    A balanced input may load what differs and not what is shared, so the shared voltage is taken unloaded. An
    interface's own rejection comes on top.
    """
    wish = plan.wish
    known = wish.part_tolerance if tolerance is None else tolerance
    shared = plan.shared_leg
    loading = plan.leg.gain / shared.gain
    worst, standard = loading * worst_rejection(shared, known), loading * standard_rejection(shared, known)
    hum_worst, hum_standard = wish.common_mode_vrms / worst, wish.common_mode_vrms / standard
    return Rejection(
        worst, standard, hum_worst, hum_standard, hum_worst / wish.full_vrms, hum_standard / wish.full_vrms
    )


def worst_rejection(leg: Leg, tolerance: float) -> float:
    """Return the mean of both gains over their difference, one leg letting most through and the other least."""
    high = leg.toleranced(tolerance, 0.0, most=True).gain
    low = leg.toleranced(tolerance, 0.0, most=False).gain
    return (high + low) / 2.0 / (high - low)


def standard_rejection(leg: Leg, tolerance: float) -> float:
    """Return one over the standard uncertainty of the relative difference of both gains, all parts independent."""
    each = [sensitivity for name, sensitivity in leg.sensitivities() if name != "input impedance"]
    return 1.0 / (math.sqrt(2.0) * math.hypot(*each) * rectangular(tolerance))
