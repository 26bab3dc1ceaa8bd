"""Shows how a measurement goes: a bar with the time left on a terminal, questions, and the table at the end."""

import locale
import sys
from types import TracebackType
from typing import TYPE_CHECKING, Self

from wattproof.cli.measure_person import Person
from wattproof.core.wording import sentence
from wattproof.procedures.requests import Progress
from wattproof.procedures.statement import PowerStatement
from wattproof.report.characters import in_ascii
from wattproof.runner.screen import Asked, Event, Progressed, Prompted

if TYPE_CHECKING:
    from rich.progress import Progress as Bar

    from wattproof.report.sheet import Sheet

_SIGNS = "±µΩ−–"
_WIDEST, _NARROWEST = 100, 60


class Watcher:
    """Sees every event of a run, in the main thread."""

    def __init__(self, person: Person) -> None:
        self._person = person
        self._bar: Bar | None = None
        self._plain = not _shows(_SIGNS)

    def __enter__(self) -> Self:
        """Show a bar where stderr is a terminal."""
        if sys.stderr is not None and sys.stderr.isatty():
            from rich.console import Console  # noqa: PLC0415 - costs a tenth of a second, which a script saves
            from rich.progress import BarColumn, TextColumn  # noqa: PLC0415 - likewise
            from rich.progress import Progress as RichBar  # noqa: PLC0415 - likewise

            columns = (BarColumn(), TextColumn("{task.fields[left]}"), TextColumn("{task.description}"))
            self._bar = RichBar(*columns, console=Console(stderr=True), transient=True)
            self._bar.start()
            self._bar.add_task("", total=1.0, left="")
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Take the bar away."""
        if self._bar is not None:
            self._bar.stop()

    def see(self, event: Event) -> None:
        """Show an event, and pass on what the person says."""
        self._person.look()
        match event:
            case Progressed(progress=progress):
                self._show(progress)
            case Asked(ask_id=ask_id, ask=ask):
                if self._bar is not None:
                    self._bar.stop()
                self._person.answer(ask_id, ask)
                if self._bar is not None:
                    self._bar.start()
            case Prompted(ask=ask):
                self._person.prompt(ask)
            case _:
                return

    def _show(self, progress: Progress) -> None:
        if self._bar is None:
            return
        words = sentence(progress.doing)
        heat = "" if progress.heat_left_s is None else f"; {progress.heat_left_s:.0f} s to a part's rating"
        text = in_ascii(words + heat) if self._plain else words + heat
        minutes, seconds = divmod(round(progress.left_s), 60)
        task = self._bar.task_ids[0]
        self._bar.update(task, completed=progress.share, description=text, left=f"{minutes}:{seconds:02d} left")


def table_text(statement: PowerStatement) -> str:
    """Return the table of a statement as wide as fits, in ASCII where the place cannot show the trade's signs."""
    from rich.console import Console  # noqa: PLC0415 - costs a tenth of a second, which JSON saves

    from wattproof.report.power_table import power_table  # noqa: PLC0415 - likewise

    console = Console()
    width = max(_NARROWEST, min(console.width, _WIDEST))
    colour = console.is_terminal and not console.no_color
    return power_table(statement, width=width, colour=colour, ascii_only=not _shows(_SIGNS))


def sheet_shown(sheet: "Sheet") -> str:
    """Return a page as wide as fits, in ASCII where the place cannot show the trade's signs."""
    from rich.console import Console  # noqa: PLC0415 - costs a tenth of a second, which JSON saves

    from wattproof.report.sheet import sheet_text  # noqa: PLC0415 - likewise

    console = Console()
    width = max(_NARROWEST, min(console.width, _WIDEST))
    colour = console.is_terminal and not console.no_color
    return sheet_text(sheet, width=width, colour=colour, ascii_only=not _shows(_SIGNS))


def _shows(text: str) -> bool:
    try:
        text.encode(getattr(sys.stdout, "encoding", None) or "ascii")
        text.encode(locale.getencoding())
    except UnicodeEncodeError:
        return False
    return True
