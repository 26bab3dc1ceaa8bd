"""What an attenuator adds by itself: thermal noise, a low-pass with its cable, and a clamp's distortion."""

import math

import attrs

from wattproof.dsp.attenuator import Plan

BOLTZMANN_J_PER_K = 1.380649e-23  # exact since 2019 (SI Brochure, 9th edition)
ROOM_K = 300.0  # a warm box
BAND_HZ = 20_000.0 - 20.0
ASSUMED_DYNAMIC_RANGE = 10.0 ** (110.0 / 20.0)  # where the interface's noise is not stated; common practice, no source
CLAMP_FREQUENCIES_HZ = (1_000.0, 20_000.0)
_BUILT_IN_V = 0.7  # of a silicon junction; textbook value, no source read
_GRADING = 0.5  # abrupt junction, C = C0/(1 + V/φ)^½: the textbook's closed form
_ORDERS = range(2, 10)
_POINTS = 256  # of one period; the junction's charge is smooth, so far more than nine orders need


@attrs.frozen
class Noise:
    """Thermal noise at the input in 20 Hz to 20 kHz, the interface's own, and what both make of it."""

    thermal_vrms: float
    interface_vrms: float
    interface_is_assumed: bool

    @property
    def share(self) -> float:
        """Thermal noise over the interface's, as a plain ratio."""
        return self.thermal_vrms / self.interface_vrms

    @property
    def rise(self) -> float:
        """Both together over the interface's alone, as a plain ratio."""
        return math.hypot(1.0, self.share)


def noise(plan: Plan) -> Noise:
    """Return the thermal noise √(4kTRB) of what the input looks into: both legs where it is balanced."""
    wish = plan.wish
    resistance = plan.leg.node_ohm * (2.0 if wish.is_balanced else 1.0)
    thermal = math.sqrt(4.0 * BOLTZMANN_J_PER_K * ROOM_K * resistance * BAND_HZ)
    own = wish.interface_noise_vrms
    return Noise(thermal, wish.full_scale_vrms / ASSUMED_DYNAMIC_RANGE if own is None else own, own is None)


def capacitance_f(plan: Plan) -> float:
    """Return what loads a pin, F: the cable, and the clamp where there is one."""
    return (plan.wish.cable_pf + (plan.wish.clamp_pf or 0.0)) * 1e-12


def bandwidth_hz(plan: Plan) -> float:
    """Return the −3 dB frequency of the leg with its cable: 1/(2πRC); infinite without capacitance."""
    capacitance = capacitance_f(plan)
    return 1.0 / (2.0 * math.pi * plan.leg.node_ohm * capacitance) if capacitance else math.inf


def loss(plan: Plan, frequency_hz: float) -> float:
    """Return what the cable takes away at a frequency, as a plain ratio of at least 1."""
    return math.hypot(1.0, frequency_hz / bandwidth_hz(plan))


def clamp_distortion(plan: Plan, frequency_hz: float) -> float | None:
    """Return the distortion that a clamp makes at full power, harmonics 2 to 9 to the fundamental; None without one.

    A clamp's junction holds a charge Q(v) that is no straight line, so its current through the source resistance R has
    harmonics: R·kω·|Qk|/V. It is reckoned as one junction alone from pin to ground, which the signal biases to its own
    peak; a pair of opposed junctions has half the capacitance and cancels most of the even orders, which is not counted
    on. First order in RωC: it holds well below the bandwidth.
    """
    if plan.wish.clamp_pf is None:
        return None
    terminals = 2.0 if plan.wish.bridge_tied else 1.0
    peak = plan.wish.terminal_peak_v * plan.leg.gain / terminals
    scale = plan.leg.node_ohm * 2.0 * math.pi * frequency_hz / peak
    return math.hypot(*(scale * k * abs(charge) for k, charge in _charges(plan.wish.clamp_pf * 1e-12, peak)))


def _charges(capacitance_f: float, peak_v: float) -> list[tuple[int, float]]:
    """Return the Fourier amplitudes of the junction's charge, C, for each order; even in cos, so cosines suffice."""
    angles = [2.0 * math.pi * n / _POINTS for n in range(_POINTS)]
    charges = [_charge(capacitance_f, peak_v * (1.0 + math.cos(angle))) for angle in angles]
    return [
        (k, 2.0 / _POINTS * math.fsum(q * math.cos(k * angle) for q, angle in zip(charges, angles, strict=True)))
        for k in _ORDERS
    ]


def _charge(capacitance_f: float, reverse_v: float) -> float:
    rest = 1.0 - _GRADING
    return capacitance_f * _BUILT_IN_V / rest * math.pow(1.0 + reverse_v / _BUILT_IN_V, rest)
