"""Takes the interface out of what was read: its response, its noise in power, and its lines where that is honest."""

import math

import attrs
import numpy as np

from wattproof.core.loopback import Response
from wattproof.core.quantity import Part, Quantity
from wattproof.dsp.intervals import rectangular
from wattproof.dsp.sources import INTERFACE, RESPONSE

LEAST_OVER_OWN = 10.0**0.1  # 1 dB in power: nearer to the own noise a difference says nothing (own measurement)
COVERAGE = 2.0
REACH = 2.0  # a line within twice what the interface may add is its own as likely as not


@attrs.frozen
class Relative:
    """What the input lets through at one frequency over what it lets through at another, as a plain ratio.

    A loop shows output and input together. Which of them bends it is not known, so the input has half of the bend (in
    dB), give or take that half: `half_log` is its size as a natural logarithm, signed.
    """

    gain: float
    half_log: float


def relative(response: Response, frequency_hz: float, to_hz: float) -> Relative:
    """Return the input's gain at frequency_hz over that at to_hz; flat beyond the ends of what was measured."""
    if not response.frequency_hz.size:
        return Relative(1.0, 0.0)
    logs = np.log(np.abs(response.gain))
    at = np.log(response.frequency_hz)
    bend = float(np.interp(math.log(frequency_hz), at, logs) - np.interp(math.log(to_hz), at, logs))
    return Relative(math.exp(bend / 2.0), bend / 2.0)


def levelled(ratio: Quantity, response: Response, frequency_hz: float, to_hz: float, socket: int) -> Quantity:
    """Return a ratio of a line at frequency_hz to one at to_hz, the input's response taken out of it."""
    if not response.frequency_hz.size:
        return ratio
    seen = relative(response, frequency_hz, to_hz)
    corrected = ratio.scaled(1.0 / seen.gain, ratio.unit)
    if seen.half_log == 0.0:
        return corrected
    part = Part(f"{RESPONSE} in {socket}", -corrected.value * rectangular(seen.half_log))
    return attrs.evolve(corrected, parts=(*corrected.parts, part))


def without_own_noise(noise: Quantity, own: Quantity) -> Quantity:
    """Return noise less the interface's own, subtracted in power; both rms in one unit and one band.

    Less than 1 dB above the own noise, or where what is left is not three times its uncertainty, it is a limit: no more
    than was read, with 2u.
    """
    square = noise.value**2 - own.value**2
    if noise.value**2 < own.value**2 * LEAST_OVER_OWN or square <= 0.0:
        return limit(noise, 0.0)
    value = math.sqrt(square)
    parts = [attrs.evolve(part, u=part.u * noise.value / value) for part in noise.parts]
    parts += [attrs.evolve(part, u=-part.u * own.value / value) for part in own.parts]
    left = Quantity(value, noise.unit, tuple(parts))
    return left if value > 3.0 * left.u else limit(noise, 0.0)


def limit(seen: Quantity, own: float, by: str = INTERFACE) -> Quantity:
    """Return what a true value cannot exceed: what was seen, the most that its own floor may have taken off, and 2u.

    The parts are those of what was seen; the value already includes them.
    """
    return Quantity(seen.value + own + COVERAGE * seen.u, seen.unit, seen.parts, by)


def in_reach(seen: Quantity, own: float) -> bool:
    """Return whether a line is within reach of what the interface may add to it."""
    return seen.value - COVERAGE * seen.u <= REACH * own


@attrs.frozen
class State:
    """What a line was read in: levels at output and input (to full scale), and the gain setting's name."""

    drive_fs: float
    input_fs: float
    gain_setting: str = ""

    def is_same(self, other: "State") -> bool:
        """Return whether levels agree within 0.05 dB, where a third harmonic still cancels by 38 dB (closed form)."""
        near = 10.0 ** (0.05 / 20.0)
        drives = max(self.drive_fs, other.drive_fs) <= near * min(self.drive_fs, other.drive_fs)
        inputs = max(self.input_fs, other.input_fs) <= near * min(self.input_fs, other.input_fs)
        return drives and inputs and self.gain_setting == other.gain_setting


def without_own_line(z: complex, own: complex, here: State, there: State) -> complex | None:
    """Return a line less the interface's own, as phasors; None where that would not be honest.

    Both are complex ratios to the fundamental, in sin θ + Σ z·e^{jkθ}. It is honest in the same state only: through an
    amplifier the phases are others, and the bound counts.
    """
    return z - own if here.is_same(there) else None
