"""`wattproof attenuator`: which resistors take an amplifier's output to an input, and what follows from them."""

import locale
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from wattproof.cli.options import number_of, value_from
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import fields_of
from wattproof.dsp.attenuator import plan
from wattproof.dsp.attenuator_wish import Wish
from wattproof.dsp.eseries import Series
from wattproof.report.attenuator_document import attenuator_document
from wattproof.report.attenuator_svg import circuit_svg
from wattproof.report.attenuator_table import attenuator_table
from wattproof.report.reading_document import json_text

_DECLARED = {field.name: field for field in fields_of(Wish)}
_SIGNS = "±µΩ−"  # what a place must show to be given a page with the trade's signs
_WIDTH = 88
Decorator = Callable[[Callable[..., Any]], Callable[..., Any]]

_EPILOG = """A bridge-tied output has no ground terminal: joining one to an interface's or an oscilloscope's ground can
destroy the amplifier. Loads get hot enough to burn. Work on opened mains equipment is for licensed practice and local
rules. Exit status: 0 planned; 2 wrong use, or no such attenuator."""


class _NamedOption(click.Option):
    """An option that is called by what a person types, also where it is missing."""

    @property
    def human_readable_name(self) -> str:
        """The option as it is typed."""
        return self.opts[0]


def _number(option: str, name: str, metavar: str, *, required: bool = False) -> Decorator:
    field = _DECLARED[name]
    has_default = not required and field.default is not None
    return click.option(
        option,
        name,
        cls=_NamedOption,
        metavar=metavar,
        type=click.UNPROCESSED,
        callback=number_of(field, whole=False),
        required=required,
        show_default=has_default,
        help=f"{field.label}: {field.help}.",
        **({"default": field.default} if has_default else {}),
    )


def _percent(option: str, name: str, default_said: str) -> Decorator:
    field = _DECLARED[name]
    checked = number_of(field, whole=False)

    def convert(ctx: click.Context, param: click.Parameter, text: Any) -> Any:  # noqa: ANN401 - click's way
        if text is None:
            return None
        try:
            ratio = float(text) / 100.0
        except ValueError:
            ratio = float("nan")
        try:
            return checked(ctx, param, ratio)
        except click.BadParameter as error:
            low, high = 100.0 * (field.minimum or 0.0), 100.0 * (field.maximum or 1.0)
            raise click.BadParameter(f"{str(text)[:40]!a}: give per cent from {low:g} to {high:g}") from error

    return click.option(
        option,
        name,
        metavar="PERCENT",
        type=click.UNPROCESSED,
        callback=convert,
        default=None,
        help=f"{field.label} in per cent. Default: {default_said}.",
    )


@click.command(epilog=_EPILOG)
@_number("--power", "power_w", "W", required=True)
@_number("--load", "load_ohm", "OHM", required=True)
@_number("--full-scale-vrms", "full_scale_vrms", "V", required=True)
@_number("--input-impedance", "input_ohm", "OHM", required=True)
@click.option("--bridge", "bridge_tied", is_flag=True, help="Both output terminals are driven; neither is ground.")
@click.option(
    "--two-inputs", is_flag=True, help="With --bridge and no balanced input: each leg has an input of its own."
)
@click.option(
    "--series",
    type=click.Choice([series.value for series in Series]),
    default=Series.E96.value,
    show_default=True,
    help="Preferred values to choose from (IEC 60063).",
)
@_percent("--tolerance", "tolerance", "0.1 with --bridge, else 1")
@_percent("--input-tolerance", "input_tolerance", "20")
@_number("--rail", "rail_v", "V")
@_number("--cable-pf", "cable_pf", "PF")
@_number("--input-limit-v", "input_limit_v", "V")
@_number("--input-limit-ma", "input_limit_ma", "MA")
@_number("--interface-noise-vrms", "interface_noise_vrms", "V")
@_number("--common-mode-vrms", "common_mode_vrms", "V")
@_number("--clamp-pf", "clamp_pf", "PF")
@click.option(
    "--svg", "svg_file", metavar="FILE", type=click.Path(dir_okay=False), help="Write the drawn circuit there."
)
@click.option("--json", "as_json", is_flag=True, help="Print a JSON document instead of the page.")
def attenuator(*, series: str, svg_file: str | None, as_json: bool, **given: Any) -> None:  # noqa: ANN401 - the options
    """Plan the attenuator between an amplifier's output and an interface's input.

    Each half of the divider is made of two parts, so that no single open or short puts the amplifier's output on the
    input. State the output's highest voltage against ground with --rail: a fault may put it on the attenuator for good.
    """
    known = {name: value for name, value in given.items() if value is not None}
    try:
        planned = plan(value_from(Wish, known | {"series": series}))
    except (ValueError, WrongUseError) as error:
        raise WrongUseError(f"attenuator: {error}") from error
    if svg_file is not None:
        _write(svg_file, circuit_svg(planned))
    if as_json:
        click.echo(json_text(attenuator_document(planned)))
        return
    click.echo(attenuator_table(planned, width=_WIDTH, ascii_only=not _shows_signs()), nl=False)


def _write(file: str, text: str) -> None:
    try:
        Path(file).write_text(text, encoding="utf-8")
    except OSError as error:
        reason = (error.strerror or "cannot be written").lower()
        raise WrongUseError(
            f"attenuator: --svg: {file}: {reason}; give a file in a folder that you may write to"
        ) from error


def _shows_signs() -> bool:
    """Return whether stdout and the locale behind it can show the trade's signs."""
    try:
        _SIGNS.encode(getattr(sys.stdout, "encoding", None) or "ascii")
        _SIGNS.encode(locale.getencoding())
    except UnicodeEncodeError:
        return False
    return True
