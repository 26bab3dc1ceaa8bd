"""A page of head lines, tables and notes for people: one shape for everything measured around the power statement."""

import io
from collections.abc import Iterator, Sequence

import attrs
from rich.console import Console, Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from wattproof.core.notes import Note
from wattproof.core.wording import sentence
from wattproof.report.characters import in_ascii

NOTHING = "nothing was kept: there is nothing to state"


@attrs.frozen
class Grid:
    """One table: its heading (may be empty), the names of its columns, and its rows as text."""

    title: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


@attrs.frozen
class Sheet:
    """A page: its title, a line on conditions, tables and notes."""

    title: str
    head: str
    grids: tuple[Grid, ...]
    notes: tuple[Note, ...] = ()


def sheet_text(sheet: Sheet, *, width: int = 80, colour: bool = False, ascii_only: bool = False) -> str:
    """Return the page, lines of at most `width` columns, without a line end at its end."""
    page = io.StringIO()
    console = Console(
        file=page,
        width=width,
        force_terminal=colour,
        color_system="standard" if colour else None,
        highlight=False,
        markup=False,
        emoji=False,
        legacy_windows=False,
    )
    console.print(Group(*_parts(sheet, ascii_only=ascii_only)))
    return "\n".join(line.rstrip() for line in page.getvalue().splitlines())


def _parts(sheet: Sheet, *, ascii_only: bool) -> Iterator[RenderableType]:
    def text(words: str, style: str = "") -> Text:
        return Text(in_ascii(words) if ascii_only else words, style)

    yield text(sheet.title, "bold")
    yield text(sheet.head)
    if not sheet.grids:
        yield text(NOTHING)
    for grid in sheet.grids:
        yield ""
        if grid.title:
            yield text(grid.title, "bold")
        yield _table(grid, ascii_only=ascii_only)
    if sheet.notes:
        yield ""
    said = dict.fromkeys(sentence(each) for each in sheet.notes)
    yield from (Padding(text(f"Note: {words}"), (0, 0, 0, 2)) for words in said)


def _table(grid: Grid, *, ascii_only: bool) -> Table:
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold", pad_edge=False)

    def cells(row: Sequence[str]) -> list[Text]:
        return [Text(in_ascii(words) if ascii_only else words) for words in row]

    for name in cells(grid.columns):
        table.add_column(name, overflow="fold")
    for row in grid.rows:
        table.add_row(*cells(row))
    return table
