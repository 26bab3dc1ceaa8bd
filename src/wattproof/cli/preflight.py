"""`wattproof measure preflight`: a look at a device before the first tone."""

from typing import Any

import click

from wattproof.app import named_rig, open_bench
from wattproof.cli.errors import OK
from wattproof.cli.options import options_of, value_from
from wattproof.core.notes import Note
from wattproof.core.wording import sentence
from wattproof.procedures.preflight import PreflightPlan
from wattproof.report.reading_document import json_text
from wattproof.runner.preflight import Preflight

SEEN_TO = 1  # exit status where something is to be seen to first


@click.command(
    epilog="It sounds a soft sweep and two soft tones, so what is on the outputs is heard. Exit status: 0 all is well; "
    "1 something is to be seen to first; 2 wrong use."
)
@click.option("--bench", default="simulated", show_default=True, help="simulated, simulated:NAME, or a device.")
@click.option("--rig", "rig_name", metavar="NAME", help="Rig that says what is joined; output 1 to input 1 without.")
@options_of(PreflightPlan)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs.")
def preflight(*, bench: str, rig_name: str | None, as_json: bool, **given: Any) -> int:  # noqa: ANN401 - the plan's
    """Look at a device before the first tone.

    Is it silent, does it capture at all, how long is the way round, is the rate real, do input and output share a
    clock, and how long are its words?
    """
    plan = value_from(PreflightPlan, given)
    rig = None if rig_name is None else named_rig(rig_name)
    opened = open_bench(bench, pace="free")
    try:
        verdict = Preflight(opened, plan, rig).run()
        name, rate_hz = opened.identity.name, opened.identity.rate_hz
    finally:
        opened.close()
    if as_json:
        told = {"warnings": _told(verdict.warnings), "facts": _told(verdict.facts)}
        click.echo(json_text({"wattproof": "preflight", "version": 1, "device": name, "rate_hz": rate_hz, **told}))
    else:
        click.echo(f"{name} at {rate_hz:g} Hz")
        for each in verdict.warnings:
            click.echo(f"  ! {sentence(each)}")
        for each in verdict.facts:
            click.echo(f"    {sentence(each)}")
    return SEEN_TO if verdict.warnings else OK


def _told(notes: tuple[Note, ...]) -> list[dict[str, object]]:
    return [{"kind": each.kind.value, **dict(each.values), "sentence": sentence(each)} for each in notes]
