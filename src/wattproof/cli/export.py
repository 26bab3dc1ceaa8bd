"""`wattproof export`: sessions as tables, sound files and pictures for other programs."""

from pathlib import Path

import click

from wattproof.cli.errors import OK, complain
from wattproof.core.errors import WrongUseError
from wattproof.report.characters import printable
from wattproof.report.table_columns import POINT_DICTIONARY
from wattproof.runner.exporting import csv_text, export_session, table_of

SOME_REFUSED = 1


@click.command(epilog="Exit status: 0 all written; 1 some sessions of a folder could not be read; 2 wrong use.")
@click.argument("sessions", nargs=-1)
@click.option("--to", "target", metavar="FOLDER", help="Where to write; each session gets a folder of its name.")
@click.option(
    "--table", "folder", metavar="FOLDER", help="Print one CSV table of the points of all sessions below a folder."
)
@click.option("--parquet", is_flag=True, help="Tables as Parquet too; needs the extra wattproof[parquet].")
def export(*, sessions: tuple[str, ...], target: str | None, folder: str | None, parquet: bool) -> int:
    """Write readings and points as CSV and JSON with a data dictionary, captures as FLAC or WAV, curves as SVG and PNG.

    Units stand in the columns' names; a column u_NAME holds the standard uncertainty of NAME.
    """
    if (folder is None) == (not sessions):
        raise WrongUseError("give either sessions with --to FOLDER, or --table FOLDER")
    if folder is not None:
        rows, refused = table_of(Path(folder))
        click.echo(csv_text(rows, list(POINT_DICTIONARY)), nl=False)
        for line in refused:
            complain(line)
        return SOME_REFUSED if refused else OK
    if target is None:
        raise WrongUseError("--to is missing; give the folder to write to")
    for session in sessions:
        files = export_session(Path(session), Path(target), parquet=parquet)
        click.echo(f"{printable(session)}: {len(files)} files in {printable(str(Path(target) / Path(session).stem))}")
    return OK
