"""Linear and logarithmic axes: values to pixels, and where the lines of the grid stand. Pure."""

import math

import attrs
import numpy as np
from numpy.typing import NDArray


@attrs.frozen
class Axis:
    """One axis from low to high, both shown."""

    low: float
    high: float
    log: bool = False

    def place(self, values: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return where values stand, 0 at low and 1 at high; log axes clamp what is not above zero to low."""
        if self.log:
            values = np.log10(np.maximum(values, self.low * 1e-3))
            return (values - math.log10(self.low)) / (math.log10(self.high) - math.log10(self.low))
        return (values - self.low) / (self.high - self.low)

    def spot(self, value: float) -> float:
        """Return where one value stands, 0 at low and 1 at high."""
        if self.log:
            low, high = math.log10(self.low), math.log10(self.high)
            return (math.log10(max(value, self.low * 1e-3)) - low) / (high - low)
        return (value - self.low) / (self.high - self.low)


def decades(axis: Axis) -> list[float]:
    """Return the powers of ten on a log axis, ends included."""
    first, last = math.ceil(math.log10(axis.low) - 1e-9), math.floor(math.log10(axis.high) + 1e-9)
    return [10.0**exponent for exponent in range(first, last + 1)]


def between(axis: Axis) -> list[float]:
    """Return twice and five times the powers of ten inside a log axis."""
    first, last = math.floor(math.log10(axis.low)), math.ceil(math.log10(axis.high))
    steps = [m * 10.0**e for e in range(first, last + 1) for m in (2, 5)]
    return [step for step in steps if axis.low < step < axis.high]


def widened(axis: Axis, value: float) -> Axis:
    """Return a log axis with whole decades added until the value lies inside."""
    if not value > 0 or not math.isfinite(value):
        return axis
    low, high = axis.low, axis.high
    while value < low:
        low /= 10
    while value > high:
        high *= 10
    return Axis(low, high, log=True)


def tidy(value: float) -> float:
    """Return the next of 1, 2, 5 × 10ⁿ at or above a value."""
    if not value > 0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(value))
    return next(step * power for step in (1, 2, 5, 10) if step * power >= value * (1 - 1e-9))
