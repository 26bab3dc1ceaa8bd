"""The commands of `wattproof`, and how one call of it ends."""

import glob
import importlib
import os
import sys
from collections.abc import Callable, Mapping, Sequence
from importlib import metadata
from types import MappingProxyType
from typing import Any

import click

from wattproof.cli.errors import NAME, OK, guarded
from wattproof.core.errors import WrongUseError

OpenWindow = Callable[[str], int]
COMMANDS: Mapping[str, tuple[str, str]] = MappingProxyType({
    "attenuator": ("wattproof.cli.attenuator", "attenuator"),
    "compare": ("wattproof.cli.compare", "compare"),
    "export": ("wattproof.cli.export", "export"),
    "measure": ("wattproof.cli.measure", "measure"),
    "devices": ("wattproof.cli.devices", "devices"),
    "read": ("wattproof.cli.read", "read"),
    "recheck": ("wattproof.cli.recheck", "recheck"),
    "report": ("wattproof.cli.report", "report"),
})  # fmt: skip


class LazyGroup(click.Group):
    """A group whose commands are imported when they are asked for, so that each call loads only what it needs."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the names of all commands."""
        return sorted({*super().list_commands(ctx), *COMMANDS})

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Return a command, or None where there is none of that name."""
        return command_named(cmd_name) if cmd_name in COMMANDS else super().get_command(ctx, cmd_name)

    def invoke(self, ctx: click.Context) -> Any:  # noqa: ANN401 - whatever the command returns
        """Carry out a command; a usage error that lost its command on the way gets it back."""
        try:
            return super().invoke(ctx)
        except click.UsageError as error:
            name = ctx.invoked_subcommand
            if error.ctx is None and name is not None:
                error.ctx = click.Context(command_named(name), parent=ctx, info_name=name)
            raise


def command_named(name: str) -> click.Command:
    """Return one of COMMANDS, importing it where it is asked for the first time."""
    module, attribute = COMMANDS[name]
    command: click.Command = getattr(importlib.import_module(module), attribute)
    return command


def version() -> str:
    """Return the version that is installed, or that none is where the package runs from its source."""
    try:
        return metadata.version(NAME)
    except metadata.PackageNotFoundError:
        return "(not installed)"


def _print_version(ctx: click.Context, _param: click.Parameter, wanted: bool) -> None:  # noqa: FBT001 - click's way
    if wanted and not ctx.resilient_parsing:
        click.echo(f"{NAME} {version()}")
        ctx.exit()


@click.group(
    cls=LazyGroup,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog="Exit status: 0 all is well; 1 something was not as it should be; 2 wrong use.",
)
@click.option(
    "--version", is_flag=True, is_eager=True, expose_value=False, callback=_print_version, help="Print the version."
)
@click.option(
    "--bench",
    metavar="BENCH",
    help="What the window measures with: simulated, simulated:NAME, a recording's path, or a device. "
    "Default: simulated.",
)
@click.pass_context
def wattproof(ctx: click.Context, bench: str | None) -> int:
    """State what an audio amplifier really delivers, with evidence that others can check.

    Without a command the window opens and measures at once: on a simulated amplifier, or on the bench that is named. A
    real amplifier is a danger to loads, loudspeakers and people: work on the mains side belongs to those licensed for
    it, and local codes come first.
    """
    if ctx.invoked_subcommand is None:
        open_window: OpenWindow = ctx.obj
        return open_window("simulated" if bench is None else bench)
    if bench is not None:
        raise click.UsageError(f"--bench belongs to the window; leave it out with {ctx.invoked_subcommand}")
    _require_output()
    return OK


def run(arguments: Sequence[str], open_window: OpenWindow, open_log: Callable[[], str]) -> int:
    """Carry out one call and return its exit status.

    `open_window` opens the window on a bench and returns when it is closed; `open_log` makes the log file ready and
    returns its path.
    """

    def call() -> int:
        given = with_wildcards(arguments) if os.name == "nt" else list(arguments)
        try:
            with wattproof.make_context(NAME, given, obj=open_window) as ctx:
                answer: Any = wattproof.invoke(ctx)
        except click.exceptions.Exit as ended:  # what --help and --version end with
            _require_output()
            return ended.exit_code
        return answer if isinstance(answer, int) else OK

    return guarded(call, open_log)


def _require_output() -> None:
    if sys.stdout is None:
        raise WrongUseError("standard output is closed; give it a file or a terminal to write to")


def with_wildcards(arguments: Sequence[str]) -> list[str]:
    """Return the arguments with file wildcards expanded, as shells do everywhere but on Windows."""
    return [path for argument in arguments for path in _matches(argument)]


def _matches(argument: str) -> list[str]:
    if argument.startswith("-"):
        return [argument]
    return sorted(glob.glob(argument)) or [argument]  # noqa: PTH207 - the pattern may be absolute, on any drive
