"""How the outcomes of `wattproof read` come out: JSON, tables, a progress bar, one line per refused file, a status."""

import locale
import sys
from collections.abc import Iterable, Iterator, Sequence
from typing import TextIO

from wattproof.cli.errors import OK, WRONG_USE, complain
from wattproof.core.reading import State
from wattproof.report.characters import in_ascii
from wattproof.report.reading_document import Document, file_document, files_document, json_text, refusal_document
from wattproof.runner.read_files import FileRead, FileRefused, Outcome

NOT_OK = 1  # read, but some reading is not ok
_SIGNS = "±µΩ−"  # what a place must show to be given tables with the trade's signs
_WIDEST = 100  # columns; wider lines are hard to follow
_NARROWEST = 60


def exit_status(outcomes: Sequence[Outcome]) -> int:
    """Return 2 where a file could not be read, else 1 where some reading is not ok, else 0."""
    if any(isinstance(outcome, FileRefused) for outcome in outcomes):
        return WRONG_USE
    states = [reading.state for outcome in outcomes if isinstance(outcome, FileRead) for reading in outcome.readings]
    return OK if all(state is State.OK for state in states) else NOT_OK


def say_refusals(outcomes: Sequence[Outcome]) -> None:
    """Write one line on stderr for each file that could not be read, in order."""
    for outcome in outcomes:
        if isinstance(outcome, FileRefused):
            complain(outcome.why if _shows(sys.stderr, outcome.why) else in_ascii(outcome.why))


def with_progress(outcomes: Iterable[Outcome], count: int) -> Iterator[Outcome]:
    """Pass the outcomes on, with a bar on stderr where it is a terminal and there are several."""
    if count == 1 or sys.stderr is None or not sys.stderr.isatty():
        yield from outcomes
        return
    from rich.console import Console  # noqa: PLC0415 - costs a tenth of a second, which a call without a bar saves
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TimeRemainingColumn  # noqa: PLC0415 - likewise

    columns = ("reading", BarColumn(), MofNCompleteColumn(), TimeRemainingColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as progress:
        yield from progress.track(outcomes, total=count)


def as_document(outcomes: Sequence[Outcome]) -> str:
    """Return one JSON document: the file's own where there is one file, else that of several."""
    documents = [_document(outcome) for outcome in outcomes]
    return json_text(documents[0] if len(documents) == 1 else files_document(documents))


def _document(outcome: Outcome) -> Document:
    if isinstance(outcome, FileRefused):
        return refusal_document(outcome.file, outcome.why)
    return file_document(outcome.source, outcome.readings)


def as_tables(outcomes: Sequence[Outcome]) -> str:
    """Return the tables of the files that were read, as wide as fits, in ASCII where it must be."""
    read_ones = [outcome for outcome in outcomes if isinstance(outcome, FileRead)]
    if not read_ones:
        return ""
    from rich.console import Console  # noqa: PLC0415 - costs a tenth of a second, which JSON saves

    from wattproof.report.reading_table import reading_table  # noqa: PLC0415 - likewise

    console = Console()
    width = max(_NARROWEST, min(console.width, _WIDEST))
    colour = console.is_terminal and not console.no_color
    plain = not _shows(sys.stdout, _SIGNS)
    tables = (
        reading_table(one.source, one.readings, width=width, colour=colour, ascii_only=plain) for one in read_ones
    )
    return "\n\n\n".join(tables)


def _shows(stream: TextIO | None, text: str) -> bool:
    """Return whether a stream and the locale behind it can show the text; in a C locale Python itself says UTF-8."""
    try:
        text.encode(getattr(stream, "encoding", None) or "ascii")
        text.encode(locale.getencoding())
    except UnicodeEncodeError:
        return False
    return True
