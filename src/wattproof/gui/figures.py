"""Numbers as a person reads them: digits that the uncertainty supports, a real minus sign, a fitting unit prefix."""

import math

import attrs

from wattproof.core.quantity import Quantity
from wattproof.core.rounding import expanded
from wattproof.core.units import DB_PER_RELATIVE, db

MINUS = "−"
DASH = "—"
_MOST_DIGITS = 3  # what two metres can use; more would flicker
_PREFIXES = ((1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n"))


@attrs.frozen
class Worded:
    """A number in words: `number` without unit, its `unit`, and `plus_minus` in the same unit ("" where unknown)."""

    number: str
    unit: str
    plus_minus: str = ""

    def __str__(self) -> str:
        return f"{self.number} {self.unit}".strip()


def decimals(value: float, uncertainty: float, most: int = _MOST_DIGITS) -> int:
    """Return how many decimals to write: at most `most` digits, none finer than the uncertainty's second digit."""
    wanted = most - 1 - _exponent(value, most)
    if uncertainty > 0:
        wanted = min(wanted, 1 - _exponent(uncertainty, 2))
    return max(0, wanted)


def _exponent(value: float, digits: int) -> int:
    """Return the power of ten of the first digit, after rounding to `digits` digits."""
    if value == 0 or not math.isfinite(value):
        return 0
    return int(f"{abs(value):.{digits - 1}e}".partition("e")[2])


def number(value: float, places: int) -> str:
    """Return a number with fixed decimals, a real minus sign and a point whatever the locale."""
    text = f"{value:.{places}f}"
    if float(text) == 0:
        text = text.lstrip("-")
    return text.replace("-", MINUS)


def plus_minus(uncertainty: float) -> str:
    """Return an uncertainty with two significant digits (GUM 7.2.6), "" for none."""
    if not uncertainty > 0 or not math.isfinite(uncertainty):
        return ""
    return number(uncertainty, max(0, 1 - _exponent(uncertainty, 2)))


def worded(value: float, uncertainty: float, unit: str, most: int = _MOST_DIGITS) -> Worded:
    """Return a value with its uncertainty in one unit, each with the digits it supports."""
    places = decimals(value, uncertainty, most)
    spread = plus_minus(uncertainty)
    if spread and uncertainty < 0.05 * 10.0**-places:
        spread = f"< {number(10.0 ** -(places + 1), places + 1)}"  # finer than the digits shown: more would not be read
    return Worded(number(value, places), unit, spread)


def prefixed(value: float, uncertainty: float, unit: str, most: int = _MOST_DIGITS) -> Worded:
    """Return a value in the unit or its thousandths, so that it is at least 0.1 where that can be."""
    size = abs(value)
    factor, prefix = next(((f, p) for f, p in _PREFIXES if size >= 0.1 * f), (1.0, ""))
    return worded(value / factor, uncertainty / factor, prefix + unit, most)


def quantity(given: Quantity, unit: str) -> Worded:
    """Return a quantity in its own unit with a prefix where it is small."""
    return prefixed(given.value, expanded(given), unit)


def percent(ratio: Quantity) -> Worded:
    """Return a plain ratio in per cent."""
    return worded(100 * ratio.value, 100 * expanded(ratio), "%")


def decibels(ratio: float, unit: str = "dB", places: int = 1) -> str:
    """Return a plain ratio in dB with its unit, or a dash where there is none to state."""
    return f"{number(db(ratio), places)} {unit}" if ratio > 0 else DASH


def decibel_uncertainty(ratio: Quantity) -> float:
    """Return the 95 % uncertainty of a ratio in dB (first order)."""
    return DB_PER_RELATIVE * expanded(ratio) / ratio.value if ratio.value > 0 else 0.0


def frequency(hertz: float) -> str:
    """Return a frequency for a label: Hz below a thousand, else kHz."""
    return f"{hertz:.5g} Hz" if hertz < 1000 else f"{hertz / 1000:.5g} kHz"
