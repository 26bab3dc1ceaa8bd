"""`wattproof measure calibrate`: what the interface itself adds, by loopback, and its volts by a meter."""

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import attrs
import click

from wattproof.app import calibration_folder, named_rig, open_bench
from wattproof.cli.errors import OK
from wattproof.cli.options import option_of, options_of, value_from
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import fields_of
from wattproof.core.wording import sentence
from wattproof.procedures.calibrate import CalibratePlan
from wattproof.procedures.level_calibration import Meter
from wattproof.procedures.requests import Action, Ask
from wattproof.report.calibration_document import calibration_document, calibration_lines
from wattproof.report.reading_document import json_text
from wattproof.runner.calibrating import DONE, make_calibration, plug_words
from wattproof.runner.screen import Event, Progressed
from wattproof.store.calibration_file import write_calibration
from wattproof.store.record_file import file_name

Command = TypeVar("Command", bound=Callable[..., Any])
_METER = "meter_"


def _meter_options(command: Command) -> Command:
    for field in reversed(fields_of(Meter)):
        command = option_of(attrs.evolve(field, name=_METER + field.name))(command)
    return command


@click.command(
    epilog="Take the amplifier off the outputs first: a calibration sounds up to --highest-fs. Exit status: 0 "
    "calibrated; 2 wrong use or a loop that is not as it should be."
)
@click.option("--bench", default="simulated", show_default=True, help="simulated, simulated:NAME, or a device.")
@click.option("--rig", "rig_name", metavar="NAME", help="Rig whose sockets are calibrated; stored, or a file's path.")
@options_of(CalibratePlan)
@click.option("--meter/--no-meter", default=None, help="Compare with a meter for volts; asked for on a device.")
@_meter_options
@click.option("--wired", is_flag=True, help="The direct loop stands already and nobody plugs; needs --no-pad.")
@click.option("--output", "file", metavar="FILE", help="Where to store the record. Default: the program's data folder.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs.")
@click.pass_context
def calibrate(  # noqa: PLR0913 - one parameter per option, as click hands them over
    ctx: click.Context,
    /,
    *,
    bench: str,
    rig_name: str | None,
    meter: bool | None,
    wired: bool,
    file: str | None,
    as_json: bool,
    **given: Any,  # noqa: ANN401 - the options of plan and meter
) -> int:
    """Calibrate an interface by loopback: outputs joined to inputs, directly and through a pad.

    Tells apart what converter-out and converter-in add; measures delay, response, level, noise, crosstalk and clock;
    with a meter also the volts of full scale.
    """
    plan = value_from(CalibratePlan, given)
    sheet = value_from(
        Meter, {name.removeprefix(_METER): value for name, value in given.items() if name.startswith(_METER)}
    )
    rig = None if rig_name is None else named_rig(rig_name)
    if wired and plan.pad:
        raise click.UsageError("--wired has nobody who plugs the pad; add --no-pad")
    opened = open_bench(bench, pace="free")
    try:
        with_meter = meter is True or (meter is None and not opened.identity.real)
        named = ctx.get_parameter_source("highest_fs") is click.core.ParameterSource.COMMANDLINE
        run = make_calibration(opened, plan, sheet if with_meter else None, rig, raise_limit=named)
        record = run.run(
            lambda event: _tell(event, quiet=as_json), lambda ask: _person(ask, quiet=as_json, wired=wired)
        )
    finally:
        opened.close()
    path = Path(file) if file else calibration_folder() / file_name(f"{record.device}-{record.rate_hz:g}")
    write_calibration(path, record)
    click.echo(json_text(calibration_document(record, str(path))) if as_json else "\n".join(calibration_lines(record)))
    if not as_json:
        click.echo(f"\nStored in {path}")
    return OK


def _tell(event: Event, *, quiet: bool) -> None:
    if isinstance(event, Progressed) and not quiet and sys.stderr is not None and sys.stderr.isatty():
        click.echo(sentence(event.progress.doing), err=True)


def _person(ask: Ask, *, quiet: bool, wired: bool) -> float | str:
    """Ask the person at the terminal.

    Raises:
        WrongUseError: there is none, or what was given is no number of volts.
    """
    words = plug_words(ask)
    if wired and ask.action is Action.CONNECT:
        return DONE
    if quiet or sys.stdin is None or not sys.stdin.isatty():
        raise WrongUseError(f"somebody has to do this: {words}; run it in a terminal without --json, or in the window")
    if ask.action is Action.CONFIRM:
        return str(click.prompt(words, err=True, type=str))
    click.prompt(f"{words}. Press Enter when it is done", default="", show_default=False, err=True)
    return DONE
