"""A number with its unit, its standard uncertainty and where that comes from (JCGM 100:2008, "GUM")."""

import math

import attrs

STATISTICS = "statistics"  # the source id of the random part of one reading


@attrs.frozen
class Part:
    """One contribution to an uncertainty.

    `source` ids are shared between quantities, so that a ratio knows what cancels. `u` is signed: sensitivity times
    the source's standard uncertainty, in the quantity's own unit (GUM 5.1.2). `dof` are its degrees of freedom.
    """

    source: str
    u: float
    dof: float = math.inf

    def __attrs_post_init__(self) -> None:  # not as validators: a live reading makes some forty of these
        if not math.isfinite(self.u):
            raise ValueError(f"Part.u is {self.u}; it must be a finite number")
        if not self.dof > 0:
            raise ValueError(f"Part.dof is {self.dof} for {self.source}; it must be above zero")


@attrs.frozen
class Quantity:
    """A value with its budget. `limited_by` names what makes it a limit and no measurement, for example the interface.

    Sources within one quantity are independent of each other; the standard uncertainty is their root sum of squares
    (GUM 5.1.2), the degrees of freedom follow Welch and Satterthwaite (GUM G.4.1, not truncated here).
    """

    value: float
    unit: str
    parts: tuple[Part, ...] = ()
    limited_by: str | None = None

    def __attrs_post_init__(self) -> None:
        if not math.isfinite(self.value):
            raise ValueError(f"Quantity.value is {self.value}; it must be a finite number")

    @property
    def u(self) -> float:
        """The combined standard uncertainty, in the quantity's unit."""
        return math.hypot(*(part.u for part in self.parts))

    @property
    def dof(self) -> float:
        """The effective degrees of freedom; infinite where no part is uncertain."""
        u = self.u
        if u == 0.0:
            return math.inf
        weight = sum((part.u / u) ** 4 / part.dof for part in self.parts)
        return 1.0 / weight if weight else math.inf

    def scaled(self, factor: float, unit: str) -> "Quantity":
        """Return the quantity times an exact factor, in another unit."""
        parts = tuple(attrs.evolve(part, u=part.u * factor) for part in self.parts)
        return Quantity(self.value * factor, unit, parts, self.limited_by)


def measured(value: float, u: float, unit: str, dof: float = math.inf) -> Quantity:
    """Return a quantity whose only part so far is the reading's own statistics."""
    return Quantity(value, unit, (Part(STATISTICS, u, dof),))
