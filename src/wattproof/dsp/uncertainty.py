"""Arithmetic on quantities that carry their budget: what they share is added with its sign before anything is squared.

First order, JCGM 100:2008 ("GUM"), 5.1 and 5.2. Two quantities are correlated exactly by the sources that their parts
name in common, so a ratio loses what is common to both of its terms. The random part of a reading has the same bare
name in each (`core.quantity.STATISTICS`) although its scatter is its own: `named_scatter` tells them apart, and
arithmetic between two that were not told apart is refused, since no answer would be honest.
"""

import math
from collections.abc import Sequence

import attrs

from wattproof.core.quantity import STATISTICS, Part, Quantity
from wattproof.core.units import DB_PER_RELATIVE, db, from_db

JOINT_MARK = "#"  # "name#1", "name#2": parts of one set of simultaneous observations, with joint degrees of freedom
_ROW_DIGITS = 15  # of a float64: below that, a remainder of the factorisation is rounding

Term = tuple[float, Quantity]  # sensitivity, and what it belongs to


def exact(value: float, unit: str) -> Quantity:
    """Return a quantity without uncertainty."""
    return Quantity(value, unit)


def known(value: float, unit: str, source: str, u: float, dof: float = math.inf) -> Quantity:
    """Return a quantity with one named source of uncertainty, `u` in its own unit."""
    return Quantity(value, unit, (Part(source, u, dof),))


def named_scatter(quantity: Quantity, name: str) -> Quantity:
    """Return the quantity with its random part named as this reading's own, so that it stays apart from others'."""
    parts = tuple(
        attrs.evolve(part, source=f"{STATISTICS} of {name}") if part.source == STATISTICS else part
        for part in quantity.parts
    )
    return attrs.evolve(quantity, parts=parts)


def combined(value: float, unit: str, terms: Sequence[Term]) -> Quantity:
    """Return a result of which each term's sensitivity (∂f/∂x, GUM 5.1.3) is known.

    Parts of one source are added with their signs. Where a term is a limit the result is one too.

    Raises:
        ValueError: two terms carry an unnamed random part, or one source with differing degrees of freedom.
    """
    bare = sum(any(part.source == STATISTICS for part in quantity.parts) for _, quantity in terms)
    if bare > 1:
        raise ValueError(f"{bare} terms have a part '{STATISTICS}'; tell their scatter apart with named_scatter first")
    u: dict[str, float] = {}
    dof: dict[str, float] = {}
    for sensitivity, quantity in terms:
        for part in quantity.parts:
            if dof.setdefault(part.source, part.dof) != part.dof:
                known_dof = f"{dof[part.source]:g} and {part.dof:g}"
                raise ValueError(
                    f"source '{part.source}' has {known_dof} degrees of freedom; one source has one number"
                )
            u[part.source] = u.get(part.source, 0.0) + sensitivity * part.u
    limits = [quantity.limited_by for _, quantity in terms if quantity.limited_by is not None]
    parts = tuple(Part(source, total, dof[source]) for source, total in u.items())
    return Quantity(value, unit, parts, limits[0] if limits else None)


def total(quantities: Sequence[Quantity]) -> Quantity:
    """Return the sum of quantities of one unit.

    Raises:
        ValueError: none given, or their units differ.
    """
    unit = _one_unit(quantities)
    return combined(math.fsum(q.value for q in quantities), unit, [(1.0, q) for q in quantities])


def difference(minuend: Quantity, subtrahend: Quantity) -> Quantity:
    """Return minuend − subtrahend, of one unit.

    Raises:
        ValueError: their units differ.
    """
    unit = _one_unit((minuend, subtrahend))
    return combined(minuend.value - subtrahend.value, unit, [(1.0, minuend), (-1.0, subtrahend)])


def product(first: Quantity, second: Quantity, unit: str) -> Quantity:
    """Return first · second in `unit`; for a square use `power`."""
    return combined(first.value * second.value, unit, [(second.value, first), (first.value, second)])


def ratio(over: Quantity, under: Quantity, unit: str = "1") -> Quantity:
    """Return over / under in `unit`.

    Raises:
        ValueError: the lower term is zero.
    """
    if under.value == 0.0:
        raise ValueError(f"a ratio to zero {under.unit} has no value; it needs a lower term other than zero")
    value = over.value / under.value
    return combined(value, unit, [(1.0 / under.value, over), (-value / under.value, under)])


def power(base: Quantity, exponent: float, unit: str) -> Quantity:
    """Return base ** exponent in `unit`.

    Raises:
        ValueError: the base is uncertain about zero, where first order says nothing (JCGM 101:2008, 9.4), or it is
            negative under a broken exponent.
    """
    if exponent in {0.0, 1.0}:
        return combined(base.value**exponent, unit, [(exponent, base)])
    if base.value == 0.0 and (base.u > 0.0 or exponent < 0.0):
        raise ValueError(f"zero {base.unit} to the power {exponent:g} has no first-order uncertainty; state a limit")
    if base.value < 0.0 and not float(exponent).is_integer():
        raise ValueError(f"{base.value:g} {base.unit} to the power {exponent:g} is no real number; give it from 0 on")
    slope = exponent * base.value ** (exponent - 1.0) if base.value else 0.0
    return combined(base.value**exponent, unit, [(slope, base)])


def root(base: Quantity, unit: str) -> Quantity:
    """Return the square root in `unit`.

    Raises:
        ValueError: as `power`.
    """
    return power(base, 0.5, unit)


def decibels(plain: Quantity, unit: str = "dB") -> Quantity:
    """Return 20 lg of a plain amplitude ratio.

    Raises:
        ValueError: zero or below.
    """
    if plain.value <= 0.0:
        raise ValueError(f"a ratio of {plain.value:g} has no level in dB; it must be above zero")
    return combined(db(plain.value), unit, [(DB_PER_RELATIVE / plain.value, plain)])


def from_decibels(level: Quantity) -> Quantity:
    """Return the plain amplitude ratio of a level in dB."""
    value = from_db(level.value)
    return combined(value, "1", [(value / DB_PER_RELATIVE, level)])


def mean(quantities: Sequence[Quantity]) -> Quantity:
    """Return the mean of readings of one unit.

    Each reading's unnamed random part is its own: the means' parts add as squares, with the degrees of freedom of Welch
    and Satterthwaite. What the readings share stays whole.

    Raises:
        ValueError: none given, or their units differ.
    """
    unit = _one_unit(quantities)
    share = 1.0 / len(quantities)
    scatter = Quantity(0.0, unit, tuple(p for q in quantities for p in q.parts if p.source == STATISTICS))
    shared = [attrs.evolve(q, parts=tuple(p for p in q.parts if p.source != STATISTICS)) for q in quantities]
    result = combined(share * math.fsum(q.value for q in quantities), unit, [(share, q) for q in shared])
    if not scatter.parts:
        return result
    return attrs.evolve(result, parts=(Part(STATISTICS, share * scatter.u, scatter.dof), *result.parts))


def observed(values: Sequence[float], unit: str, source: str) -> Quantity:
    """Return the mean of repeated observations with its standard uncertainty s/√n and n − 1 (GUM 4.2).

    Raises:
        ValueError: fewer than two.
    """
    return observed_together({source: (values, unit)}, source)[source]


def observed_together(columns: dict[str, tuple[Sequence[float], str]], source: str) -> dict[str, Quantity]:
    """Return the means of quantities that were observed at the same time, row by row, with their correlation.

    `columns` gives each quantity's values and unit. The covariance of the means (GUM 5.2.3, equation 17) is factored
    (Cholesky), so that it is carried by parts that the quantities share: "source#1", "source#2" and so on. They belong
    to one set of observations with n − 1 degrees of freedom; `settled` makes one part of them before a statement.

    Raises:
        ValueError: fewer than two rows, or columns of differing length.
    """
    lengths = {len(values) for values, _ in columns.values()}
    if len(lengths) != 1 or (rows := lengths.pop()) < 2:
        raise ValueError(f"{source}: the columns must be equally long and have at least two observations")
    means = {name: math.fsum(values) / rows for name, (values, _) in columns.items()}
    off = {name: [value - means[name] for value in values] for name, (values, _) in columns.items()}
    factors = _factored(list(off.values()), rows * (rows - 1))
    return {
        name: Quantity(means[name], unit, tuple(Part(_joint(source, k), u, rows - 1) for k, u in enumerate(row, 1)))
        for (name, (_, unit)), row in zip(columns.items(), factors, strict=True)
    }


def settled(quantity: Quantity) -> Quantity:
    """Return the quantity with each set of joint parts made one part, as its degrees of freedom need it (GUM G.4.1).

    It is for stating: what such a set had in common with other quantities is no longer known afterwards.
    """
    groups: dict[str, list[Part]] = {}
    for part in quantity.parts:
        groups.setdefault(part.source.partition(JOINT_MARK)[0], []).append(part)
    parts = tuple(
        group[0] if len(group) == 1 else Part(name, math.hypot(*(part.u for part in group)), group[0].dof)
        for name, group in groups.items()
    )
    return attrs.evolve(quantity, parts=parts)


def _joint(source: str, number: int) -> str:
    return f"{source}{JOINT_MARK}{number}"


def _one_unit(quantities: Sequence[Quantity]) -> str:
    units = {quantity.unit for quantity in quantities}
    if len(units) != 1:
        raise ValueError(f"the units are {', '.join(sorted(units)) or 'missing'}; a sum needs one unit")
    return units.pop()


def _factored(off: list[list[float]], divisor: float) -> list[list[float]]:
    """Return the lower Cholesky factor of the means' covariance; a column that the others explain has no own part."""
    factor: list[list[float]] = []
    for i, column in enumerate(off):
        row: list[float] = []
        for j in range(i):
            covariance = math.fsum(a * b for a, b in zip(column, off[j], strict=True)) / divisor
            rest = covariance - math.fsum(a * b for a, b in zip(row, factor[j], strict=False))
            row.append(rest / factor[j][j] if factor[j][j] else 0.0)
        variance = math.fsum(a * a for a in column) / divisor
        rest = variance - math.fsum(a * a for a in row)
        row.append(math.sqrt(rest) if rest > variance * 10.0**-_ROW_DIGITS else 0.0)
        factor.append(row)
    return factor
