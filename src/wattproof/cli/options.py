"""Renders command-line options from fields that were declared once, and builds the value back from what was given."""

import math
import types
from collections.abc import Callable, Mapping
from enum import Enum
from typing import Any, TypeVar, get_args

import attrs
import click

from wattproof.core.errors import WrongUseError
from wattproof.core.fields import Declared, fields_of

Command = TypeVar("Command", bound=Callable[..., Any])
Value = TypeVar("Value")
_LONGEST_SHOWN = 40  # characters of a wrong value that are worth repeating


def number_of(field: Declared, *, whole: bool) -> Callable[[click.Context, click.Parameter, Any], float | int | None]:
    """Return a click callback for a finite number inside the range of a declared field; None is let through."""

    def convert(_ctx: click.Context, _param: click.Parameter, text: Any) -> float | int | None:  # noqa: ANN401 - click's
        if text is None:
            return None
        try:
            number = int(text) if whole else float(text)
        except (ValueError, OverflowError):
            number = math.nan
        if not math.isfinite(number) or not _inside(field, number):
            raise click.BadParameter(f"{_shown(str(text))}: give {_wanted(field, whole=whole)}")
        return number

    return convert


def options_of(cls: type[Any], *, without: tuple[str, ...] = ()) -> Callable[[Command], Command]:
    """Return a decorator that adds one option for each declared field of an attrs class, in order.

    A field without a default becomes a required option. `without` leaves fields out.
    """
    fields = [field for field in fields_of(cls) if field.name not in without]

    def decorate(command: Command) -> Command:
        for field in reversed(fields):
            command = option_of(field)(command)
        return command

    return decorate


def option_of(field: Declared) -> Callable[[Command], Command]:
    """Return the click option of one declared field.

    Raises:
        TypeError: no option can be made of the field's type; bool, int, float, str and Enum can, and each "or None".
    """
    kind = _kind_of(field)
    name = "--" + field.name.replace("_", "-")
    required = field.default is attrs.NOTHING
    if kind is bool:
        return click.option(
            f"{name}/--no-{name[2:]}", field.name, default=field.default, show_default=True, help=_help(field)
        )
    is_number = kind is float or kind is int
    given: dict[str, Any] = {}
    if not required and field.default is not None:
        given = {"default": _text_of(field.default), "show_default": True}
    return click.option(
        name,
        field.name,
        type=_type_of(field, kind),
        callback=number_of(field, whole=kind is int) if is_number else None,
        required=required,
        metavar=_metavar(field) if is_number else None,
        help=_help(field),
        **given,
    )


def value_from(cls: type[Value], given: Mapping[str, Any]) -> Value:
    """Build an attrs value from what its options gave; what belongs to other options is left alone.

    Raises:
        WrongUseError: the fields do not fit together; the line is the value's own.
    """
    kinds = {field.name: _kind_of(field) for field in fields_of(cls)}
    known = {name: _restored(kinds[name], value) for name, value in given.items() if name in kinds}
    try:
        return cls(**known)
    except ValueError as error:
        raise WrongUseError(str(error)) from error


def _kind_of(field: Declared) -> Any:  # noqa: ANN401 - a type, which has no common type of its own
    if not isinstance(field.kind, types.UnionType):
        return field.kind
    kinds = [kind for kind in get_args(field.kind) if kind is not type(None)]
    return kinds[0] if len(kinds) == 1 else field.kind


def _type_of(field: Declared, kind: Any) -> Any:  # noqa: ANN401 - as above; click's type of a type differs by version
    if kind is float or kind is int:
        return click.UNPROCESSED
    if kind is str:
        return click.STRING
    if isinstance(kind, type) and issubclass(kind, Enum):
        return click.Choice([str(member.value) for member in kind])
    raise TypeError(f"field {field.name} is of type {field.kind}; no option can be made of that")


def _restored(kind: Any, value: Any) -> Any:  # noqa: ANN401 - as above
    is_choice = isinstance(kind, type) and issubclass(kind, Enum) and value is not None
    return kind(value) if is_choice else value


def _text_of(default: Any) -> Any:  # noqa: ANN401 - as above
    return str(default.value) if isinstance(default, Enum) else default


def _metavar(field: Declared) -> str:
    return field.unit.upper() if field.unit.isascii() and field.unit.isalpha() else "NUMBER"


def _inside(field: Declared, number: float) -> bool:
    low, high = field.minimum, field.maximum
    return (low is None or number >= low) and (high is None or number <= high)


def _wanted(field: Declared, *, whole: bool) -> str:
    kind = "a whole number" if whole else "a number"
    low = "" if field.minimum is None else f" from {field.minimum:g}"
    high = "" if field.maximum is None else f" to {field.maximum:g}" if low else f" up to {field.maximum:g}"
    return f"{kind}{low}{high} {field.unit}".strip()


def _help(field: Declared) -> str:
    unit = f", in {field.unit}" if field.unit else ""
    return f"{field.label}{unit}: {field.help}."


def _shown(text: str) -> str:
    return f'"{text if len(text) <= _LONGEST_SHOWN else text[:_LONGEST_SHOWN] + "..."}"'
