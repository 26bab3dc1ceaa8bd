"""Fields declared once: label, unit, range and help, from which options, forms, files and reports are made."""

from typing import Any

import attrs

from wattproof.core.checks import Validator

_KEY = "wattproof"


@attrs.frozen
class Declared:
    """What is known of one field of a value. `minimum` and `maximum` bound a number, both included."""

    name: str
    kind: Any
    default: Any
    label: str
    unit: str
    help: str
    minimum: float | None
    maximum: float | None


def declared(  # noqa: PLR0913 - a declaration names everything that is known of a field
    default: Any = attrs.NOTHING,  # noqa: ANN401 - a field may be of any type
    *,
    label: str,
    help: str,  # noqa: A002 - the word that every reader expects
    unit: str = "",
    minimum: float | None = None,
    maximum: float | None = None,
    validator: Validator | None = None,
) -> Any:  # noqa: ANN401 - attrs' own field() is typed so
    """Declare a field of an attrs class.

    A number outside minimum…maximum raises ValueError when the value is built; None is let through where it is the
    default.
    """
    known = {"label": label, "unit": unit, "help": help, "minimum": minimum, "maximum": maximum}

    def check(instance: object, attribute: "attrs.Attribute[Any]", value: Any) -> None:  # noqa: ANN401
        if value is None and default is None:
            return
        if validator is not None:
            validator(instance, attribute, value)
        below = minimum is not None and not value >= minimum
        above = maximum is not None and not value <= maximum
        if below or above:
            raise ValueError(
                f"{label.lower()} is {value:g} {unit}".rstrip() + f"; it must {_bounds(minimum, maximum, unit)}"
            )

    return attrs.field(default=default, validator=check, metadata={_KEY: known})


def _bounds(minimum: float | None, maximum: float | None, unit: str) -> str:
    if maximum is None:
        return f"be at least {minimum:g} {unit}".rstrip()
    if minimum is None:
        return f"be at most {maximum:g} {unit}".rstrip()
    return f"lie from {minimum:g} to {maximum:g} {unit}".rstrip()


def fields_of(cls: type[Any]) -> tuple[Declared, ...]:
    """Return the declared fields of an attrs class, in order; fields without a declaration are left out."""
    cls = attrs.resolve_types(cls)
    return tuple(
        Declared(name=field.name, kind=field.type, default=field.default, **field.metadata[_KEY])
        for field in attrs.fields(cls)
        if _KEY in field.metadata
    )
