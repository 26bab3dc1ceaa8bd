"""`wattproof compare`: sessions side by side, with what their differences are worth."""

from pathlib import Path

import click

from wattproof.cli.errors import OK
from wattproof.core.errors import WrongUseError
from wattproof.procedures.comparing import Sitting, compared
from wattproof.report.compare_document import compare_document, compare_lines, overlaid_svg
from wattproof.report.reading_document import json_text
from wattproof.runner.session_table import sittings_of


@click.command(epilog="Exit status: 0 compared; 2 wrong use.")
@click.argument("sessions", nargs=-1, required=True)
@click.option("--plot", "plot", metavar="FILE.svg", help="Draw all curves into one picture.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs.")
def compare(*, sessions: tuple[str, ...], plot: str | None, as_json: bool) -> int:
    """Compare each session with the first one: before and after a repair, this unit and last month's.

    The last power statement of each session counts. A session with several runs can be compared with itself: its runs
    then stand side by side, the first one against the others.
    """
    found = [each for session in sessions for each in _chosen(session, alone=len(sessions) == 1)]
    if len(found) < 2:
        raise WrongUseError("there is only one power statement; give two sessions, or one with two runs")
    first, others = found[0], [(other, compared(found[0], other)) for other in found[1:]]
    if plot is not None:
        try:
            Path(plot).write_text(overlaid_svg(found), encoding="utf-8")
        except OSError as error:
            raise WrongUseError(f"--plot {plot}: it cannot be written ({error.strerror or error})") from error
    if as_json:
        click.echo(json_text(compare_document(first, others)))
    else:
        click.echo("\n".join(line for other, points in others for line in compare_lines(first, other, points)))
    return OK


def _chosen(session: str, *, alone: bool) -> list[Sitting]:
    sittings = sittings_of(Path(session))
    if not sittings:
        raise WrongUseError(
            f"{session}: it holds no power statement; measure one: wattproof measure power --session FILE"
        )
    return sittings if alone else sittings[-1:]
