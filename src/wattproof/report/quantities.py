"""Quantities as JSON documents and as cells of a table: shared by what is measured around the power statement."""

import math
from collections.abc import Mapping, Sequence
from enum import Enum

import attrs

from wattproof.core.notes import Note
from wattproof.core.quantity import Quantity
from wattproof.core.rig import Rig
from wattproof.core.rounding import rounded, stated
from wattproof.core.run import Ending
from wattproof.core.units import db
from wattproof.core.wording import sentence
from wattproof.procedures.around_plan import AroundPlan
from wattproof.report.characters import printable

Document = dict[str, object]


@attrs.frozen(eq=False)
class Frame:
    """What every document has around its result: settings, rig, ending and reason."""

    name: str
    plan: AroundPlan
    rig: Rig
    ending: Ending
    why: str = ""


def envelope(frame: Frame, content: Document, notes: Sequence[Note]) -> Document:
    """Return a whole document, version 1."""
    return {
        "wattproof": frame.name,
        "version": 1,
        "settings": plain(attrs.asdict(frame.plan)),
        "rig": plain(attrs.asdict(frame.rig)),
        "ending": frame.ending.value,
        "why": printable(frame.why),
        **content,
        "notes": list(dict.fromkeys(sentence(each) for each in notes)),
    }


def q(quantity: Quantity | None) -> Document | None:
    """Return {"value", "u", "unit", "limited_by"}, or None."""
    if quantity is None:
        return None
    return {
        "value": quantity.value,
        "u": quantity.u,
        "unit": quantity.unit,
        "limited_by": quantity.limited_by,
    }


def plain(value: object) -> object:  # noqa: PLR0911 - one for each kind of value that JSON has
    """Return a value made of what JSON has: enumerations by their value, nothing infinite."""
    match value:
        case Mapping():
            return {str(key): plain(each) for key, each in value.items()}
        case Enum():
            return value.value
        case str():
            return printable(value)
        case float() if not math.isfinite(value):
            return None
        case Sequence():
            return [plain(each) for each in value]
        case None | bool() | int() | float():
            return value
        case _:
            return printable(str(value))


def cell(quantity: Quantity | None) -> str:
    """Return value ± 95 % uncertainty with a prefix; "≤ value" where it is a limit, "–" where there is none."""
    if quantity is None:
        return "–"
    if quantity.limited_by is not None:
        bare = attrs.evolve(quantity, parts=(), value=float(f"{quantity.value:.3g}"))
        return f"≤ {stated(bare)}"
    if quantity.u * 4e3 < abs(quantity.value):  # less than one in the fourth digit: so many are enough
        return stated(attrs.evolve(quantity, parts=(), value=float(f"{quantity.value:.5g}")))
    return stated(quantity)


def db_cell(ratio: Quantity | None, unit: str = "dB", places: int = 2) -> str:
    """Return a plain amplitude ratio in dB with its 95 % uncertainty."""
    if ratio is None or ratio.value <= 0.0:
        return "–"
    level = Quantity(
        db(ratio.value), unit, tuple(attrs.evolve(p, u=8.685889638 * p.u / ratio.value) for p in ratio.parts)
    )
    if ratio.limited_by is not None:
        return f"≤ {level.value:.1f} {unit}"
    value, spread = rounded(level)
    if level.u < 0.25 * 10.0**-places:
        return f"{level.value:.{places}f} {unit}"
    return f"{value} ± {spread} {unit}"
