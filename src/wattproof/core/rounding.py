"""A quantity as it is written down: two digits of the 95 % uncertainty, and the value to the same decimal place."""

import math
from decimal import ROUND_CEILING, Context, Decimal

from wattproof.core.quantity import Quantity

_DIGITS = 2  # of an expanded uncertainty: at most two (JCGM 100:2008, 7.2.6)
_EXACT_DIGITS = 6  # of a value that carries no uncertainty
_PLAIN_PLACES = range(-9, 4)  # decimal places written out; beyond them a power of ten is split off
_Z95 = 1.959963984540054  # the 97.5 % point of the normal distribution
# For 1 to 9 degrees of freedom: JCGM 100:2008, table G.2, to the digits of scipy.special.stdtrit.
_T95 = (12.706205, 4.302653, 3.182446, 2.776445, 2.570582, 2.446912, 2.364624, 2.306004, 2.262157)
_PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}
_EXACT = Context(prec=800)  # more digits than any float64 has, from its largest to its smallest
_PREFIXED = ("V rms", "V", "W", "Hz", "Ω", "A", "s")  # units that take a prefix; ratios and decibels do not


def t95(dof: float) -> float:
    """Return the factor from a standard uncertainty to a 95 % interval, two-sided (Student).

    Degrees of freedom are truncated to a whole number (JCGM 100:2008, G.4.1). From 10 on it is Fisher's expansion
    about the normal point (Abramowitz and Stegun, 26.7.5), right to 1e-5. Below 1 there is no interval: infinite.
    """
    if math.isinf(dof):
        return _Z95
    whole = math.floor(dof)
    if whole < 1:
        return math.inf
    if whole <= len(_T95):
        return _T95[whole - 1]
    z = _Z95
    terms = (
        z,
        (z**3 + z) / 4,
        (5 * z**5 + 16 * z**3 + 3 * z) / 96,
        (3 * z**7 + 19 * z**5 + 17 * z**3 - 15 * z) / 384,
        (79 * z**9 + 776 * z**7 + 1482 * z**5 - 1920 * z**3 - 945 * z) / 92160,
    )
    return sum(term / float(whole) ** power for power, term in enumerate(terms))


def expanded(quantity: Quantity) -> float:
    """Return the 95 % uncertainty of a quantity, in its unit: t95(dof) · u."""
    u = quantity.u
    return t95(quantity.dof) * u if u else 0.0


def rounded(quantity: Quantity) -> tuple[str, str]:
    """Return value and 95 % uncertainty as text, in the quantity's own unit, both to the same decimal place.

    An exact value has the uncertainty "0" and six digits; one with less than a degree of freedom has "unknown".
    Very large and very small numbers carry a power of ten, the same in both texts.
    """
    return _rounded(quantity.value, expanded(quantity))


def stated(quantity: Quantity) -> str:
    """Return value, 95 % uncertainty and unit as one text, with a prefix where the unit takes one: 5.53 ± 0.12 mV.

    A limit already includes its uncertainty: ≤ 5.7 mV, rounded up to two digits so that it stays one.
    """
    if quantity.limited_by is not None:
        return _stated_limit(quantity)
    uncertainty = expanded(quantity)
    power, unit = _prefixed(quantity.value, uncertainty, quantity.unit)
    value, spread = _rounded(_shifted(quantity.value, -power), _shifted(uncertainty, -power))
    text = value if uncertainty == 0.0 else f"{value} ± {spread}"
    return f"{text} {unit}".strip()


def _stated_limit(quantity: Quantity) -> str:
    power, unit = _prefixed(quantity.value, 0.0, quantity.unit)
    shifted = _shifted(quantity.value, -power)
    place = _place(shifted, _DIGITS)
    exact = _decimal(shifted)
    up = exact.quantize(Decimal(1).scaleb(place), rounding=ROUND_CEILING, context=_EXACT)
    return f"≤ {_written(float(up), place)} {unit}".strip()


def _rounded(value: float, uncertainty: float) -> tuple[str, str]:
    if not math.isfinite(uncertainty):
        return _written(value, _place(value, _DIGITS)), "unknown"
    if uncertainty == 0.0:
        return f"{value:.{_EXACT_DIGITS}g}", "0"
    place = _place(uncertainty, _DIGITS)
    return _written(value, place), _written(uncertainty, place)


def _decimal(number: float) -> Decimal:
    return Decimal(repr(float(number)))  # float, since a numpy scalar has a repr of its own


def _place(number: float, digits: int) -> int:
    """Return the power of ten of the last of `digits` significant digits, after a carry (9.96 gives 10)."""
    if number == 0.0:
        return 0
    exact = _decimal(number)
    carried = round(exact, digits - 1 - exact.adjusted())
    return carried.adjusted() - digits + 1


def _written(number: float, place: int) -> str:
    if place in _PLAIN_PLACES:
        return _fixed(_decimal(number), place)
    return f"{_fixed(_decimal(number).scaleb(-place), 0)}e{place}"


def _fixed(number: Decimal, place: int) -> str:
    text = f"{number.quantize(Decimal(1).scaleb(place), context=_EXACT):f}"
    return text.removeprefix("-") if not text.strip("-0.") else text


def _shifted(number: float, power: int) -> float:
    return float(_decimal(number).scaleb(power))


def _prefixed(value: float, uncertainty: float, unit: str) -> tuple[int, str]:
    size = max(abs(value), uncertainty if math.isfinite(uncertainty) else 0.0)
    if unit not in _PREFIXED or size == 0.0:
        return 0, "" if unit == "1" else unit
    power = min(max(3 * (_decimal(size).adjusted() // 3), min(_PREFIXES)), max(_PREFIXES))
    return power, _PREFIXES[power] + unit
