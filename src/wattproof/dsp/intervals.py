"""Type B evaluations, budgets, and 95 % intervals: Student's factor, or the distribution itself where its shape counts.

JCGM 100:2008 ("GUM") 4.3 for the standard uncertainties of stated limits; JCGM 101:2008 for intervals: a distribution
of known shape is carried through instead of being taken as normal. Computed by convolution: no random numbers.
"""

import math
from collections.abc import Callable, Mapping
from enum import StrEnum

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.quantity import Part, Quantity
from wattproof.core.rounding import t95
from wattproof.dsp.uncertainty import settled

_PROBABILITY = 0.95
_BINS = 4000  # of the widest bounded part; the quantile is then right to 1e-5 of it, beside an arcsine edge too
_BINS_PER_U = 200.0  # of what is added as normal: bins this fine widen the sum by 1e-6, so finer ones are not needed
_ITERATIONS = 64  # at most; some eight are used
_PRECISION = 1e-9  # of u, or of probability
_WIDEST = 1e4  # times u; where 95 % lie beyond, the degrees of freedom are too few to say

Masses = NDArray[np.float64]


class Shape(StrEnum):
    """How an input's value is spread about its estimate (JCGM 101:2008, 6.4)."""

    NORMAL = "normal"
    RECTANGULAR = "rectangular"
    TRIANGULAR = "triangular"
    ARCSINE = "arcsine"  # U-shaped: a sine at an unknown phase, or a mismatch


_HALF_WIDTH = {Shape.RECTANGULAR: math.sqrt(3.0), Shape.TRIANGULAR: math.sqrt(6.0), Shape.ARCSINE: math.sqrt(2.0)}


def rectangular(half_width: float) -> float:
    """Return the standard uncertainty a/√3 of limits ±a between which all is equally likely (GUM 4.3.7)."""
    return half_width / _HALF_WIDTH[Shape.RECTANGULAR]


def triangular(half_width: float) -> float:
    """Return the standard uncertainty a/√6 of limits ±a about which the middle is likelier (GUM 4.3.9)."""
    return half_width / _HALF_WIDTH[Shape.TRIANGULAR]


def arcsine(half_width: float) -> float:
    """Return the standard uncertainty a/√2 of a sine of amplitude a at an unknown phase (JCGM 101:2008, 6.4.6)."""
    return half_width / _HALF_WIDTH[Shape.ARCSINE]


def resolution(step: float) -> float:
    """Return the standard uncertainty q/√12 of an indication that moves in steps of q (GUM F.2.2.1)."""
    return rectangular(step / 2.0)


@attrs.frozen
class BudgetRow:
    """One line of a budget: the source, its standard uncertainty (unsigned), its share of the variance, its dof."""

    source: str
    u: float
    share: float
    dof: float


def budget(quantity: Quantity) -> tuple[BudgetRow, ...]:
    """Return the budget of a quantity, the largest contribution first; the shares add up to 1 (or all are 0)."""
    variance = quantity.u**2
    rows = (
        BudgetRow(part.source, abs(part.u), part.u**2 / variance if variance else 0.0, part.dof)
        for part in settled(quantity).parts
    )
    return tuple(sorted(rows, key=lambda row: -row.u))


@attrs.frozen
class Interval:
    """Where the value lies with 95 %: value ± half_width, and whether the shapes of its inputs were carried through."""

    value: float
    half_width: float
    unit: str
    from_shapes: bool

    @property
    def low(self) -> float:
        """The lower end."""
        return self.value - self.half_width

    @property
    def high(self) -> float:
        """The upper end."""
        return self.value + self.half_width


def interval95(quantity: Quantity, shapes: Mapping[str, Shape] | None = None) -> Interval:
    """Return the symmetric 95 % interval of a quantity.

    Without shapes it is t95(dof)·u, the degrees of freedom truncated (GUM G.4.1). `shapes` names, by source, the inputs
    that are not normal: these are carried through as they are (JCGM 101:2008), all others together as one normal or
    Student distribution with their effective degrees of freedom. The half-width is infinite where there is less than
    one degree of freedom.
    """
    told = settled(quantity)
    bounded = [(part, shapes[part.source]) for part in told.parts if shapes and _is_bounded(part, shapes)]
    names = {part.source for part, _ in bounded}
    rest = attrs.evolve(told, parts=tuple(part for part in told.parts if part.source not in names))
    if not bounded:
        u = told.u
        return Interval(told.value, t95(told.dof) * u if u else 0.0, told.unit, from_shapes=False)
    if rest.u > 0.0 and math.floor(min(rest.dof, 1.0)) < 1:
        return Interval(told.value, math.inf, told.unit, from_shapes=True)
    masses, step = _convolved([(shape, abs(part.u) * _HALF_WIDTH[shape]) for part, shape in bounded], rest.u)
    half_width = _quantile(_within(masses, step, rest), told.u)
    return Interval(told.value, half_width, told.unit, from_shapes=True)


def _is_bounded(part: Part, shapes: Mapping[str, Shape]) -> bool:
    return part.u != 0.0 and shapes.get(part.source, Shape.NORMAL) is not Shape.NORMAL


def _cdf(shape: Shape, x: Masses) -> Masses:
    """Return the share below x for half-width 1."""
    inside = np.clip(x, -1.0, 1.0)
    if shape is Shape.RECTANGULAR:
        return (inside + 1.0) / 2.0
    if shape is Shape.TRIANGULAR:
        return np.where(inside < 0.0, (1.0 + inside) ** 2 / 2.0, 1.0 - (1.0 - inside) ** 2 / 2.0)
    return 0.5 + np.arcsin(inside) / np.pi


def _convolved(parts: list[tuple[Shape, float]], rest_u: float) -> tuple[Masses, float]:
    """Return the probability of each bin of the parts' sum, centred on zero, and the bins' width."""
    step = max(2.0 * max(half_width for _, half_width in parts) / _BINS, rest_u / _BINS_PER_U)
    masses = np.ones(1)
    for shape, half_width in parts:
        bins = math.ceil(half_width / step)
        edges = np.linspace(-bins - 0.5, bins + 0.5, 2 * bins + 2, dtype=np.float64) * (step / half_width)
        masses = np.asarray(np.convolve(masses, np.diff(_cdf(shape, edges))), dtype=np.float64)
    return masses, step


def _within(masses: Masses, step: float, rest: Quantity) -> Callable[[float], float]:
    """Return the probability that the sum lies within ±x, as a function of x."""
    reach = (masses.size - 1) / 2.0 * step
    centres = np.linspace(-reach, reach, masses.size, dtype=np.float64)
    if rest.u == 0.0:
        cumulated = np.concatenate(([0.0], np.cumsum(masses)))
        edges = np.concatenate((centres - step / 2.0, centres[-1:] + step / 2.0))
        return lambda x: float(np.interp(x, edges, cumulated) - np.interp(-x, edges, cumulated))
    from scipy.special import ndtr, stdtr  # noqa: PLC0415 - only an interval with shapes needs it

    dof, u = rest.dof, rest.u

    def below(x: Masses) -> Masses:
        return np.asarray(ndtr(x / u) if math.isinf(dof) else stdtr(math.floor(dof), x / u), dtype=np.float64)

    return lambda x: 2.0 * float(masses @ below(x - centres)) - 1.0  # the masses lie symmetrically about zero


def _quantile(within: Callable[[float], float], u: float) -> float:
    """Return where the probability is reached, by the Illinois rule of false position (Dowell and Jarratt, 1971)."""
    low, high = 0.0, 2.0 * u
    below, above = -_PROBABILITY, within(high) - _PROBABILITY
    while above < 0.0 and high < _WIDEST * u:
        low, below = high, above
        high *= 2.0
        above = within(high) - _PROBABILITY
    side = 0
    for _ in range(_ITERATIONS):
        if high - low <= _PRECISION * u or above <= 0.0:
            break
        middle = high - (high - low) * above / (above - below)
        here = within(middle) - _PROBABILITY
        if here >= 0.0:
            high, above = middle, here
            below = below / 2.0 if side > 0 else below
            side = 1
        else:
            low, below = middle, here
            above = above / 2.0 if side < 0 else above
            side = -1
        if abs(here) < _PRECISION:
            return middle
    return high
