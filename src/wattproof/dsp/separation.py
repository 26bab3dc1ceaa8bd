"""Tells a converter-out's own harmonics and noise from a converter-in's, by loops with and without a pad between.

A converter-in bends less the less it is given: its order-k product falls by (k − 1) times the pad, relative to the
fundamental. The converter-out does not see the pad, as long as its load and its drive stay. So of the complex ratios
z = D (direct) and P (through the pad), with q = pad^(k − 1): out = (P − q·D)/(1 − q), in = (D − P)/(1 − q).
"""

import cmath
import math
from collections.abc import Mapping, Sequence

import attrs

from wattproof.core.quantity import STATISTICS, Part, Quantity
from wattproof.core.reading import Reading
from wattproof.dsp.intervals import rectangular

LAW = "level law"


@attrs.frozen
class Line:
    """A harmonic as a complex ratio to the fundamental; `u` of its real or imaginary part."""

    z: complex
    u: float

    @property
    def resolved(self) -> bool:
        """Whether the noise lies 10 dB below it, so that more averaging would tell nothing new."""
        return bool(abs(self.z) >= self.u * 10.0**0.5)


def averaged(readings: Sequence[Reading]) -> Mapping[int, Line]:
    """Return each harmonic's mean over readings of one state, as complex ratios."""
    sums: dict[int, list[tuple[complex, float]]] = {}
    for reading in readings:
        for harmonic in reading.harmonics:
            z = cmath.rect(harmonic.ratio.value, harmonic.phase_rad)
            sums.setdefault(harmonic.order, []).append((z, harmonic.ratio.u))
    return {
        order: Line(sum(z for z, _ in seen) / len(seen), math.hypot(*(u for _, u in seen)) / len(seen))
        for order, seen in sums.items()
    }


@attrs.frozen
class Own:
    """The two converters' own harmonics of one order: |z| as a Quantity, and the phase."""

    order: int
    out: Quantity
    out_phase_rad: float
    into: Quantity
    into_phase_rad: float


def separated(direct: Mapping[int, Line], padded: Mapping[int, Line], pad: float) -> tuple[Own, ...]:
    """Return out and in for each order that both loops have; `pad` is the gain through it over the direct gain.

    Where the level law fails, the pad leaves more or less of the converter-in than it says: the part that it moves is
    an uncertainty of its own.

    Raises:
        ValueError: the pad does not attenuate by at least 10 dB.
    """
    if not 0.0 < pad <= 10.0**-0.5:
        raise ValueError(
            f"the pad lets {pad:.3g} of the voltage through; it takes 20 to 30 dB to tell the converters apart"
        )
    return tuple(
        _own(order, direct[order], padded[order], pad ** (order - 1)) for order in sorted(direct) if order in padded
    )


def _own(order: int, direct: Line, padded: Line, left: float) -> Own:
    into = (direct.z - padded.z) / (1.0 - left)
    out = (padded.z - left * direct.z) / (1.0 - left)
    u_into = math.hypot(direct.u, padded.u) / (1.0 - left)
    u_out = math.hypot(padded.u, left * direct.u) / (1.0 - left)
    law = rectangular(left * abs(into))
    return Own(
        order,
        Quantity(abs(out), "1", (Part(STATISTICS, u_out), Part(LAW, law))),
        cmath.phase(out) if out else 0.0,
        Quantity(abs(into), "1", (Part(STATISTICS, u_into), Part(LAW, law))),
        cmath.phase(into) if into else 0.0,
    )


def separated_noise(direct: Quantity, padded: Quantity, gain: float, pad: float) -> tuple[Quantity, Quantity]:
    """Return the noise of the converter-out (to its own full scale) and of the converter-in, from both loops' noise.

    `direct` and `padded` are rms to the input's full scale; `gain` is the direct loop's. A part that the other drowns
    comes out as zero with the uncertainty that it then has.
    """
    share = gain * gain * (1.0 - pad * pad)
    u_direct, u_padded = 2.0 * direct.value * direct.u, 2.0 * padded.value * padded.u
    out = (direct.value**2 - padded.value**2) / share
    into = (padded.value**2 - pad * pad * direct.value**2) / (1.0 - pad * pad)
    u_out = math.hypot(u_direct, u_padded) / share
    u_into = math.hypot(u_padded, pad * pad * u_direct) / (1.0 - pad * pad)
    return _root(out, u_out), _root(into, u_into)


def _root(square: float, u_square: float) -> Quantity:
    value = math.sqrt(max(square, 0.0))
    u = min(u_square / (2.0 * value), math.sqrt(u_square)) if value else math.sqrt(u_square)
    return Quantity(value, "1", (Part(STATISTICS, u),))
