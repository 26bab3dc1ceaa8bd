"""`wattproof recheck`: whether sessions are as they were written, and their readings what their raw captures give."""

import re
from pathlib import Path

import click

from wattproof.cli.errors import OK
from wattproof.core.errors import WrongUseError
from wattproof.report.characters import printable
from wattproof.report.reading_document import json_text
from wattproof.report.recheck_document import recheck_document, recheck_lines
from wattproof.store.recheck import OF_UNCERTAINTY, RELATIVE
from wattproof.store.recheck import recheck as check

DIFFERS = 1
_HASH = re.compile(r"[0-9a-fA-F]{64}")


@click.command(
    epilog=f"A figure is reproduced when it differs by no more than {OF_UNCERTAINTY:g} of its standard uncertainty and "
    f"{RELATIVE:g} of itself. Exit status: 0 all reproduced and consistent; 1 something differs or is missing; 2 "
    "wrong use."
)
@click.argument("sessions", nargs=-1, required=True)
@click.option("--expect", "expected", metavar="HASH", help="Hash from the report; one session only.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs.")
def recheck(*, sessions: tuple[str, ...], expected: str | None, as_json: bool) -> int:
    """Make every reading of sessions again from its raw capture, with today's code, on all cores.

    Looks at the file, the chain of its records, each capture, and each figure. Without --expect a chain that was
    rewritten as a whole cannot be told from the first one: the program then says consistent, and no more.
    """
    if expected is not None and not _HASH.fullmatch(expected.strip()):
        raise WrongUseError(
            f"--expect {printable(expected)[:80]}: it is no hash; give 64 hexadecimal digits, as in the report"
        )
    if expected is not None and len(sessions) > 1:
        raise WrongUseError("--expect belongs to one session; check the others in a call of their own")
    outcomes = [check(Path(session), (expected or "").strip().lower()) for session in sessions]
    if as_json:
        click.echo(json_text(recheck_document(outcomes)))
    else:
        click.echo("\n".join(line for outcome in outcomes for line in recheck_lines(outcome)))
    return OK if all(outcome.sound for outcome in outcomes) else DIFFERS
