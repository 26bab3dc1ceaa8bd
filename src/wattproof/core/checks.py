"""Validators for the fields of values: a wrong one cannot be built, and says which field and why."""

import math
from collections.abc import Callable
from typing import Any

import attrs

Validator = Callable[[Any, "attrs.Attribute[Any]", Any], None]


def _name(instance: object, attribute: "attrs.Attribute[Any]") -> str:
    return f"{type(instance).__name__}.{attribute.name}"


def finite(instance: object, attribute: "attrs.Attribute[Any]", value: float) -> None:
    """Accept a finite number.

    Raises:
        ValueError: NaN or infinite.
    """
    if not math.isfinite(value):
        raise ValueError(f"{_name(instance, attribute)} is {value}; it must be a finite number")


def positive(instance: object, attribute: "attrs.Attribute[Any]", value: float) -> None:
    """Accept a finite number above zero.

    Raises:
        ValueError: anything else.
    """
    if not (math.isfinite(value) and value > 0):
        raise ValueError(f"{_name(instance, attribute)} is {value}; it must be above zero")


def not_negative(instance: object, attribute: "attrs.Attribute[Any]", value: float) -> None:
    """Accept a finite number of at least zero.

    Raises:
        ValueError: anything else.
    """
    if not (math.isfinite(value) and value >= 0):
        raise ValueError(f"{_name(instance, attribute)} is {value}; it must be zero or above")


def within(low: float, high: float) -> Validator:
    """Return a validator that accepts numbers from low to high, both included."""

    def check(instance: object, attribute: "attrs.Attribute[Any]", value: float) -> None:
        if not low <= value <= high:
            raise ValueError(f"{_name(instance, attribute)} is {value}; it must lie from {low:g} to {high:g}")

    return check


def counted_from_one(instance: object, attribute: "attrs.Attribute[Any]", value: int) -> None:
    """Accept a number that counts from 1, as sockets and channels do.

    Raises:
        ValueError: zero or below.
    """
    if value < 1:
        raise ValueError(f"{_name(instance, attribute)} is {value}; it counts from 1")
