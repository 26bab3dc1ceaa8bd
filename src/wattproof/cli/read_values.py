"""The values that `wattproof read` takes on its options, each refused in one line that says what to give instead."""

import math
import re
from collections.abc import Callable

import click

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_LONGEST_SHOWN = 40  # characters of a wrong value that are worth repeating


def amount(unit: str, example: str, least: float, most: float) -> Callable[..., float | None]:
    """Return a click callback for a number in `unit` from `least` to `most`, both included."""

    def convert(_ctx: click.Context, _param: click.Parameter, text: str | None) -> float | None:
        if text is None:
            return None
        number = _number(text)
        if number is None or not least <= number <= most:
            raise click.BadParameter(
                f"{_shown(text)} is no number of {unit} from {least:g} to {most:g}; give {example}"
            )
        return number

    return convert


def band(_ctx: click.Context, _param: click.Parameter, text: str | None) -> tuple[float, float] | None:
    """Return both edges of a band LO-HI in Hz, or None where none was given.

    Raises:
        click.BadParameter: not two numbers, negative, reversed or empty.
    """
    if text is None:
        return None
    match = re.fullmatch(f"({_NUMBER})-({_NUMBER})", text, re.ASCII)
    low, high = (_number(match[1]), _number(match[2])) if match else (None, None)
    if low is None or high is None or low < 0 or high < 0:
        raise click.BadParameter(f"{_shown(text)} is no band in Hz; give LO-HI, for example 20-20000")
    if low >= high:
        raise click.BadParameter(f"{_shown(text)} is reversed or empty; give the lower edge first: 20-20000")
    return low, high


def channel(_ctx: click.Context, _param: click.Parameter, text: str) -> int | None:
    """Return a channel number, or None for "all".

    Raises:
        click.BadParameter: anything else.
    """
    if text == "all":
        return None
    if not re.fullmatch(r"0*[1-9]\d{0,5}", text, re.ASCII):
        raise click.BadParameter(f"{_shown(text)} is no channel; they count from 1: give 1, 2, ... or all")
    return int(text)


def _shown(text: str) -> str:
    return ascii(text if len(text) <= _LONGEST_SHOWN else text[:_LONGEST_SHOWN] + "...")


def _number(text: str) -> float | None:
    """Return a finite number written with digits, or None."""
    if not re.fullmatch(_NUMBER, text, re.ASCII):
        return None
    number = float(text)
    return number if math.isfinite(number) else None
