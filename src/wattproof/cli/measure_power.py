"""`wattproof measure power` and `power-by-hand`: the power statement from the command line."""

import contextlib
from collections.abc import Callable
from typing import Any, TypeVar

import attrs
import click

from wattproof.app import make_measurement, named_rig, open_bench
from wattproof.bench.protocol import Bench
from wattproof.cli.errors import OK, complain
from wattproof.cli.kept_session import kept_session
from wattproof.cli.measure_person import Confirmation, Person
from wattproof.cli.measure_progress import Watcher, table_text
from wattproof.cli.options import options_of, value_from
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.procedures.guard import FIRST_POWER_UP
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan
from wattproof.procedures.presets import preset_plan
from wattproof.report.power_document import power_document
from wattproof.report.power_words import ONSET_DEFINITION
from wattproof.report.reading_document import json_text
from wattproof.runner.keeping import SessionKeeper
from wattproof.runner.measuring import Measured, Measurement
from wattproof.store.session_values import Keeping

Command = TypeVar("Command", bound=Callable[..., Any])
NOT_DONE = 1
_EPILOG = (
    "Exit status: 0 done, also where a point cannot be reached; 1 stopped or failed, what was kept is printed; "
    "2 wrong use. "
    + ONSET_DEFINITION
    + " Before a repaired amplifier is powered the first time: "
    + "; ".join(FIRST_POWER_UP)
    + "."
)


def _shared(command: Command) -> Command:
    """Add the options that both procedures share besides their settings."""
    for option in reversed((
        click.option("--bench", default="simulated", show_default=True, help="simulated, simulated:NAME, device, file"),
        click.option("--rig", "rig_name", metavar="NAME", help="Rig that is wired; stored, or a file's path."),
        click.option("--session", metavar="FILE", help="Session file (NAME.wattproof) to append to."),
        click.option(
            "--keep",
            type=click.Choice([each.value for each in Keeping]),
            default=Keeping.ALL.value,
            show_default=True,
            help="Raw captures that stay in the session: all, or those of each stated point and its neighbours.",
        ),
        click.option("--device", metavar="TEXT", help="Amplifier, as its plate says; kept in the session."),
        click.option("--serial", metavar="TEXT", help="Its serial number; kept in the session."),
        click.option("--claim", metavar="TEXT", help="What the maker claims; kept in the session."),
        click.option("--tested-by", metavar="TEXT", help="Who tests it; kept in the session."),
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


@click.command("power", epilog=_EPILOG)
@options_of(StepsPlan)
@_shared
def power(**given: Any) -> int:  # noqa: ANN401 - one parameter per option, as click hands them over
    """Find by steps what an amplifier delivers: at the onset of clipping, at 1 % and 10 % THD+N.

    What it does: the drive begins at -60 dBFS and rises, coarse then fine around each point; each is then held and read
    again. With several --loads or --channels it goes on with the next.

    What it asks: to confirm load and limits before the first tone, to set the volume control, to switch loads and
    channels (always in silence), and "I am here" every two minutes while a part is above a quarter of its rating.

    What it limits: drive (the rig's limit and --drive-vrms), --limit-vrms, --limit-w, --limit-thdn, --limit-over-s; it
    mutes by itself when the output falls at once, as a protection circuit makes it.
    """
    return _run(StepsPlan, given)


@click.command("power-by-hand", epilog=_EPILOG)
@options_of(HandPlan)
@click.option(
    "--hand-db-per-s",
    type=click.FloatRange(0.2, 60.0),
    default=6.0,
    show_default=True,
    help="Speed of the simulated hand; a real one turns as it likes.",
)
@_shared
def power_by_hand(**given: Any) -> int:  # noqa: ANN401 - likewise
    """Follow a hand on the amplifier's own volume control, and say what the amplifier delivers.

    What it does: the tone stands at its drive while the control is turned up; THD+N is followed live. After 10 % the
    tone is muted; then each point is held by lowering the drive, and the control is turned down again for comparison.

    What it asks: to confirm load and limits, to turn the control down, up and down again, to leave it between.

    What it limits: as `power`; --limit-vrms and the others mute at once.
    """
    return _run(HandPlan, given)


def _run(kind: type[PowerPlan], given: dict[str, Any]) -> int:
    plan = preset_plan(value_from(kind, given))
    rig = None if given["rig_name"] is None else named_rig(given["rig_name"])
    bench = open_bench(given["bench"], pace="free")
    with contextlib.closing(bench), kept_session(given) as keeper:
        keep = None if keeper is None else keeper.keep
        measurement = make_measurement(bench, plan, rig, given.get("hand_db_per_s", 6.0), keep)
        person = _person(bench, plan, measurement, given)
        if keeper is not None:
            keeper.begin(measurement, bench)
        measured = _measured(measurement, person, keeper)
        told = _told(measured, as_json=given["as_json"])
    return max(told, NOT_DONE if keeper is not None and keeper.trouble else OK)


def _person(bench: Bench, plan: PowerPlan, measurement: Measurement, given: dict[str, Any]) -> Person:
    confirmation = Confirmation(given["confirm_load_ohm"], plan.limit_vrms, measurement.rows[0].load.nominal_ohm)
    person = Person(measurement.runner, confirmation, nobody_needed=not bench.identity.real)
    person.check_before()
    return person


def _measured(measurement: Measurement, person: Person, keeper: SessionKeeper | None) -> Measured:
    """Run to the end, or until Ctrl-C: then the tone is silent and what was kept is told."""
    try:
        with Watcher(person) as watcher:
            return measurement.run(watcher.see if keeper is None else keeper.before(watcher.see))
    except KeyboardInterrupt:
        stopped = measurement.measured()
        return attrs.evolve(stopped, ending=Ending.STOPPED, why="stopped by the keyboard")


def _told(measured: Measured, *, as_json: bool) -> int:
    rig: Rig = measured.rig
    if as_json:
        click.echo(json_text(power_document(measured.statement, rig, measured.ending, measured.why)))
    else:
        click.echo(table_text(measured.statement))
    if measured.ending is Ending.DONE:
        return OK
    complain(f"{measured.ending.value}: {measured.why or 'by a person'}")
    return NOT_DONE
