"""The preferred values of resistors: IEC 60063, series E24 and E96."""

import math
from bisect import bisect_left, bisect_right
from enum import StrEnum
from functools import cache

_E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
_E96_PER_DECADE = 96
LEAST_OHM = 1.0
MOST_OHM = 1e7  # what is sold in every series; beyond, leakage over dirt and skin counts as much as the part


class Series(StrEnum):
    """A series of IEC 60063."""

    E24 = "E24"
    E96 = "E96"


def mantissas(series: Series) -> tuple[float, ...]:
    """Return the values of one decade, from 1 to below 10.

    IEC 60063:2015. E24 is a table (it is no rounded geometric series); E96 is 10^(i/96) rounded to three digits.
    """
    if series is Series.E24:
        return tuple(value / 10 for value in _E24)
    return tuple(round(100 * 10 ** (i / _E96_PER_DECADE)) / 100 for i in range(_E96_PER_DECADE))


@cache
def values(series: Series) -> tuple[float, ...]:
    """Return every value of a series from LEAST_OHM to MOST_OHM, in Ω, ascending."""
    decades = range(round(math.log10(LEAST_OHM)), round(math.log10(MOST_OHM)))
    # through whole hundredths, so that 2.74 in the fourth decade is 2740 and not 2740.0000000000005
    found = [round(mantissa * 100) * 10**decade / 100 for decade in decades for mantissa in mantissas(series)]
    return (*found, MOST_OHM)


def between(series: Series, low_ohm: float, high_ohm: float) -> tuple[float, ...]:
    """Return the values of a series from low_ohm to high_ohm, both included, ascending; empty where there is none."""
    every = values(series)
    return every[bisect_left(every, low_ohm) : bisect_right(every, high_ohm)]


def at_most(series: Series, ohm: float) -> float | None:
    """Return the largest value of a series that is not above `ohm`, or None where there is none."""
    every = values(series)
    place = bisect_right(every, ohm)
    return every[place - 1] if place else None
