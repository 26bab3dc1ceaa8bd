"""`wattproof measure`: the group of procedures that run on a bench, each imported when it is asked for."""

import importlib
from collections.abc import Mapping
from types import MappingProxyType

import click

PROCEDURES: Mapping[str, tuple[str, str]] = MappingProxyType({
    "calibrate": ("wattproof.cli.calibrate", "calibrate"),
    "response": ("wattproof.cli.measure_around", "response"),
    "frequency": ("wattproof.cli.measure_around", "frequency"),
    "gain": ("wattproof.cli.measure_around", "gain"),
    "output-resistance": ("wattproof.cli.measure_around", "output_resistance"),
    "crosstalk": ("wattproof.cli.measure_around", "crosstalk"),
    "efficiency": ("wattproof.cli.measure_around", "efficiency"),
    "idle": ("wattproof.cli.measure_around", "idle"),
    "power": ("wattproof.cli.measure_power", "power"),
    "preflight": ("wattproof.cli.preflight", "preflight"),
    "power-by-hand": ("wattproof.cli.measure_power", "power_by_hand"),
})  # fmt: skip


class ProcedureGroup(click.Group):
    """A group whose procedures are imported when they are asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the names of all procedures."""
        return sorted({*super().list_commands(ctx), *PROCEDURES})

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Return a procedure's command, or None where there is none of that name."""
        if cmd_name not in PROCEDURES:
            return super().get_command(ctx, cmd_name)
        module, attribute = PROCEDURES[cmd_name]
        command: click.Command = getattr(importlib.import_module(module), attribute)
        return command


@click.group(cls=ProcedureGroup)
def measure() -> None:
    """Run a procedure on a bench: simulated, simulated:NAME, a device, or a recording's path.

    A real amplifier is a danger to loads, loudspeakers and people: a dummy load, hands off hot parts, somebody beside
    it. Work on the mains side belongs to those licensed for it, and local codes come first.
    """
