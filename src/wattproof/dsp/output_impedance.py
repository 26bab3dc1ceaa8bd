"""Output impedance from the voltages that one drive gives across two loads, and the damping factor as an interval."""

import math

import attrs

from wattproof.core.quantity import Part, Quantity
from wattproof.core.rounding import expanded

MEANINGLESS = 0.5  # of the impedance: with so much doubt a damping factor has no upper end worth stating


@attrs.frozen
class AcrossLoad:
    """What a load showed: its resistance, the complex voltage across it, and u of that voltage's real part."""

    ohm: Quantity
    volts: complex
    u_volts: float


def two_loads(over_v: complex, under_v: complex, over_ohm: float, under_ohm: float) -> complex:
    """Return the output impedance in ohm: Ra·Rb·(Va − Vb)/(Ra·Vb − Rb·Va), from a source behind it (Thévenin).

    An unloaded output has an infinite Ra: Rb·(Va − Vb)/Vb.
    """
    if math.isinf(over_ohm):
        return under_ohm * (over_v - under_v) / under_v
    return _impedance(over_v, under_v, over_ohm, under_ohm)


def _impedance(over_v: complex, under_v: complex, over_ohm: complex, under_ohm: complex) -> complex:
    return over_ohm * under_ohm * (over_v - under_v) / (over_ohm * under_v - under_ohm * over_v)


@attrs.frozen
class OutputImpedance:
    """Resistance and reactance in ohm, each with its budget, and the magnitude."""

    resistance: Quantity
    reactance: Quantity
    magnitude: Quantity


def output_impedance(over: AcrossLoad, under: AcrossLoad, repeats: float) -> OutputImpedance:
    """Return the output impedance from two loads with its budget, to first order.

    `repeats` is the standard uncertainty of the ratio of both voltages that no noise shows: contacts, warmth, drift.
    """
    values = (over.volts, under.volts, over.ohm.value, under.ohm.value)
    z = two_loads(*values)
    by_over = _slope(values, 0)
    by_under = _slope(values, 1)
    terms = [
        ("scatter over", abs(by_over) * over.u_volts, abs(by_over) * over.u_volts),
        ("scatter under", abs(by_under) * under.u_volts, abs(by_under) * under.u_volts),
        ("repeatability", abs(by_under * under.volts) * repeats, abs(by_under * under.volts) * repeats),
    ]
    for index, load in ((2, over.ohm), (3, under.ohm)):
        slope = _slope(values, index)
        terms += [(part.source, slope.real * part.u, slope.imag * part.u) for part in load.parts]
    resistance = Quantity(z.real, "Ω", tuple(Part(name, u) for name, u, _ in terms))
    reactance = Quantity(z.imag, "Ω", tuple(Part(name, u) for name, _, u in terms))
    size = abs(z)
    share = (z.real / size, z.imag / size) if size else (1.0, 1.0)
    along = [Part(name, math.hypot(share[0] * re, share[1] * im)) for name, re, im in terms]
    return OutputImpedance(resistance, reactance, Quantity(size, "Ω", tuple(along)))


def _slope(values: tuple[complex, complex, float, float], index: int) -> complex:
    """Return the derivative by one of the four values, by a central difference."""
    step = 1e-6 * abs(values[index])
    up: list[complex] = list(values)
    down: list[complex] = list(values)
    up[index] += step
    down[index] -= step
    return (_impedance(*up) - _impedance(*down)) / (2.0 * step)


@attrs.frozen
class Damping:
    """The damping factor at a load: value and 95 % interval; `high` is None where only a lower bound can be stated."""

    value: float
    low: float
    high: float | None

    @property
    def words(self) -> str:
        """Return the interval, or the bound, as text."""
        if self.high is None:
            return f"greater than {self.low:.2g}"
        return f"{self.low:.3g} to {self.high:.3g}"


def damping(load_ohm: float, impedance: Quantity) -> Damping:
    """Return load over impedance; where the impedance is uncertain by half or more, a lower bound only."""
    spread = expanded(impedance)
    size = impedance.value
    low = load_ohm / (size + spread)
    value = load_ohm / size if size > 0.0 else math.inf
    if spread >= MEANINGLESS * size:
        return Damping(value, low, None)
    return Damping(value, low, load_ohm / (size - spread))
