"""`wattproof measure` of what stands around the power statement: response, frequency, idle, gain and the others."""

import contextlib
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import attrs
import click

from wattproof.app import make_sitting, named_rig, open_bench
from wattproof.bench.protocol import Bench
from wattproof.cli.errors import OK, complain
from wattproof.cli.measure_person import Confirmation, Person
from wattproof.cli.measure_progress import Watcher, sheet_shown
from wattproof.cli.options import options_of, value_from
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.run import Ending
from wattproof.procedures.around_plan import AroundPlan
from wattproof.procedures.crosstalk import CrosstalkPlan
from wattproof.procedures.efficiency import EfficiencyPlan
from wattproof.procedures.frequency import FrequencyPlan
from wattproof.procedures.gain import GainPlan
from wattproof.procedures.idle import IdlePlan
from wattproof.procedures.output_resistance import OutputResistancePlan
from wattproof.procedures.response import ResponsePlan
from wattproof.report.around import document_of, sheet_of
from wattproof.report.quantities import Frame
from wattproof.report.reading_document import json_text
from wattproof.runner.around import Found, Sitting

Command = TypeVar("Command", bound=Callable[..., Any])
NOT_DONE = 1
_EPILOG = (
    "Exit status: 0 done; 1 stopped or failed, what was kept is still printed; 2 wrong use. A dummy load, hands off "
    "hot parts; work on the mains side belongs to those licensed for it, and local codes come first."
)


def _shared(command: Command) -> Command:
    """Add the options that all of these procedures share besides their settings."""
    for option in reversed((
        click.option("--bench", default="simulated", show_default=True, help="simulated[:NAME], a device, or a file."),
        click.option("--rig", "rig_name", metavar="NAME", help="Rig that is wired; stored, or a file's path."),
        click.option("--calibration", "calibration_file", metavar="FILE", help="Calibration record of the interface."),
        click.option(
            "--set",
            "settings",
            metavar="NAME=VALUE",
            multiple=True,
            help="Simulated bench only: turn one of its own controls, as knob=-10, bass=6 or load=4.",
        ),
        click.option(
            "--confirm-load",
            "confirm_load_ohm",
            metavar="OHM",
            type=float,
            help="Real bench without a terminal: I confirm that this load is connected; needs --limit-vrms.",
        ),
        click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs."),
    )):  # fmt: skip
        command = option(command)
    return command


@click.command("idle", epilog=_EPILOG)
@options_of(IdlePlan)
@_shared
def idle(**given: Any) -> int:  # noqa: ANN401 - one parameter per option, as click hands them over
    """Read noise and hum at rest: unweighted, A-weighted, ITU-R BS.468-4 quasi-peak, density, mains lines, offset.

    What it asks: to plug the amplifier's input off the interface and terminate it. A faint tone (-60 dBFS) is played
    once to see that it no longer arrives. The interface's own noise is taken out in power, or the figure is a limit.
    """
    return _run("idle", IdlePlan, given)


@click.command("response", epilog=_EPILOG)
@options_of(ResponsePlan)
@_shared
def response(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Read level and phase against frequency at a stated level, by stepped tones, a swept sine, or both.

    Stepped tones are exact at every point; a swept sine shows the whole curve and distortion by order. --relative reads
    tone controls, filters or loudness against their flat setting. --loop reads the interface itself first. Above 5 kHz
    and below 40 Hz tones come in bursts; a sweep is only sounded up to 2.5 W.
    """
    return _run("response", ResponsePlan, given)


@click.command("frequency", epilog=_EPILOG)
@options_of(FrequencyPlan)
@_shared
def frequency(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Read THD+N against frequency while the output voltage stays the same.

    The drive is steered at every tone. Above 5 kHz and below 40 Hz tones come in bursts. Where no harmonic is left
    inside the band the curve says so: THD+N would fall there without the amplifier being any better.
    """
    return _run("frequency", FrequencyPlan, given)


@click.command("gain", epilog=_EPILOG)
@options_of(GainPlan)
@_shared
def gain(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Read gain, input sensitivity, channel balance and polarity, and tracking along the control's travel.

    What it asks: with --positions, to turn the control to each of them, always in silence. Channels that behave
    differently are pointed out; a control that works on one side only is named.
    """
    return _run("gain", GainPlan, given)


@click.command("output-resistance", epilog=_EPILOG)
@options_of(OutputResistancePlan)
@_shared
def output_resistance(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Read output resistance and damping factor against frequency, from two loads at one drive.

    What it asks: to switch the load, in silence, and back at the end to see what has drifted. The damping factor is an
    interval, or "greater than" where no more can be said. A valve amplifier never runs without a load: --valve.
    """
    return _run("output-resistance", OutputResistancePlan, given)


@click.command("crosstalk", epilog=_EPILOG)
@options_of(CrosstalkPlan)
@_shared
def crosstalk(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Read crosstalk both ways against frequency: the tone alone, in the channel that is not driven.

    What it asks: to terminate the input of the channel that is not driven. A ground wire that both channels share shows
    as crosstalk.
    """
    return _run("crosstalk", CrosstalkPlan, given)


@click.command("efficiency", epilog=_EPILOG)
@options_of(EfficiencyPlan)
@_shared
def efficiency(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Read efficiency and heat: volts and amperes of the supply, typed, against the output power.

    What it asks: to read the supply's meters at each level, or --supply gives them beforehand. The tone stands as long
    as somebody reads: stay with the load.
    """
    return _run("efficiency", EfficiencyPlan, given)


def _run(name: str, kind: type[AroundPlan], given: dict[str, Any]) -> int:
    plan = value_from(kind, given)
    settings = dict(_setting(text) for text in given["settings"])
    rig = None if given["rig_name"] is None else named_rig(given["rig_name"])
    calibration = _calibration(given["calibration_file"])
    bench = open_bench(given["bench"], pace="free")
    with contextlib.closing(bench):
        sitting = make_sitting(bench, plan, rig, calibration, settings)
        person = _person(bench, plan, sitting, given)
        found = _found(sitting, person)
    return _told(name, plan, found, as_json=given["as_json"])


def _setting(text: str) -> tuple[str, float]:
    name, _, value = text.partition("=")
    try:
        return name.strip(), float(value)
    except ValueError as error:
        raise WrongUseError(f"--set {text!a}: give NAME=VALUE with a number, as knob=-10") from error


def _calibration(file: str | None) -> Calibration | None:
    if file is None:
        return None
    from wattproof.store.calibration_file import read_calibration  # noqa: PLC0415 - only where one is named

    return read_calibration(Path(file))


def _person(bench: Bench, plan: AroundPlan, sitting: Sitting, given: dict[str, Any]) -> Person:
    confirmation = Confirmation(given["confirm_load_ohm"], plan.limit_vrms, sitting.rows[0].load.nominal_ohm)
    person = Person(sitting.runner, confirmation, nobody_needed=not bench.identity.real)
    person.check_before()
    return person


def _found(sitting: Sitting, person: Person) -> Found:
    """Run to the end, or until Ctrl-C: then the tone is silent and what was kept is told."""
    try:
        with Watcher(person) as watcher:
            return sitting.run(watcher.see)
    except KeyboardInterrupt:
        return attrs.evolve(sitting.found(), ending=Ending.STOPPED, why="stopped by the keyboard")


def _told(name: str, plan: AroundPlan, found: Found, *, as_json: bool) -> int:
    if as_json:
        click.echo(json_text(document_of(found.result, Frame(name, plan, found.rig, found.ending, found.why))))
    else:
        click.echo(sheet_shown(sheet_of(found.result)))
    if found.ending is Ending.DONE:
        return OK
    complain(f"{found.ending.value}: {found.why or 'by a person'}")
    return NOT_DONE
