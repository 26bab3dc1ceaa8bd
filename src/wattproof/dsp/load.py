"""The resistance that takes the power, with its budget, and what its inductance does to the power."""

import math

import attrs

from wattproof.core.quantity import Part, Quantity
from wattproof.core.rig import Load
from wattproof.dsp.intervals import rectangular
from wattproof.dsp.sources import LOAD
from wattproof.dsp.uncertainty import ratio

INDUCTANCE_COUNTS_HZ = 2_000.0  # above it P = V²·R/|Z|²


def four_wire(volts: Quantity, amperes: Quantity) -> Quantity:
    """Return a resistance from DC voltage at its terminals and current through it (Ohm's law), in Ω.

    Raises:
        ValueError: no current.
    """
    return ratio(volts, amperes, "Ω")


def resistance(load: Load, name: str) -> Quantity:
    """Return the resistance during a run, in Ω; `name` is the channel's, so that channels stay apart.

    Measured cold and hot it lies between both; measured cold only, between that and what the temperature coefficient
    makes of the stated rise; not measured, it is nominal within its tolerance. Limits are rectangular (GUM 4.3.7).
    """
    source = f"{LOAD} {name}"
    if load.measured_ohm is None and load.hot_ohm is None:
        u = rectangular(load.tolerance * load.nominal_ohm)
        return Quantity(load.nominal_ohm, "Ω", (Part(f"{source} tolerance", u),))
    cold, hot = load.ends_ohm
    middle = load.ohm
    parts = [Part(f"{source} measured", rectangular(load.accuracy * middle))]
    if hot != cold:
        parts.append(Part(f"{source} warming", rectangular((hot - cold) / 2.0)))
    return Quantity(middle, "Ω", tuple(parts))


def power(volts: Quantity, load: Load, name: str, frequency_hz: float) -> Quantity:
    """Return the power in W that a voltage across the load's terminals puts into it: V²/R, above 2 kHz V²·R/|Z|²."""
    ohm = resistance(load, name)
    reactance = 2.0 * math.pi * frequency_hz * load.inductance_h if frequency_hz > INDUCTANCE_COUNTS_HZ else 0.0
    squared = ohm.value**2 + reactance**2
    value = volts.value**2 * ohm.value / squared
    by_volts = 2.0 * volts.value * ohm.value / squared
    by_ohm = volts.value**2 * (reactance**2 - ohm.value**2) / squared**2
    parts = [attrs.evolve(part, u=by_volts * part.u) for part in volts.parts]
    parts += [attrs.evolve(part, u=by_ohm * part.u) for part in ohm.parts]
    return Quantity(value, "W", tuple(parts), volts.limited_by)
