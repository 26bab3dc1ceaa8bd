"""Plain ratios as levels in dB with their uncertainty: needed only at the rim."""

import math

import attrs

from wattproof.core.quantity import Quantity
from wattproof.core.units import DB_PER_RELATIVE, db


def in_db(ratio: Quantity | None, unit: str) -> Quantity | None:
    """Return 20 lg of a plain ratio, its uncertainty to first order (GUM 5.1.2).

    None where there is no such level: no ratio, zero or below, or an uncertainty that is beyond expression in dB.
    """
    if ratio is None or ratio.value <= 0.0:
        return None
    slope = DB_PER_RELATIVE / ratio.value
    us = [part.u * slope for part in ratio.parts]
    if not math.isfinite(math.hypot(*us)):
        return None
    parts = tuple(attrs.evolve(part, u=u) for part, u in zip(ratio.parts, us, strict=True))
    return Quantity(db(ratio.value), unit, parts, ratio.limited_by)
