"""A power statement as a table for people, the paragraph in plain language, and what flatters."""

import io
from collections.abc import Iterator

from rich.console import Console, Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from wattproof.core.reading import Reference
from wattproof.core.wording import sentence
from wattproof.procedures.statement import PowerStatement, StatedPoint, StatedRow
from wattproof.report.characters import in_ascii
from wattproof.report.power_words import ONSET_DEFINITION, figure, paragraph

NOTHING = "nothing was kept: no power can be stated"


def power_table(statement: PowerStatement, *, width: int = 80, colour: bool = False, ascii_only: bool = False) -> str:
    """Return the statement, lines of at most `width` columns, without a line end at its end. ± is at 95 %."""
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
    console.print(Group(*_page(statement, ascii_only=ascii_only)))
    return "\n".join(line.rstrip() for line in page.getvalue().splitlines())


def _page(statement: PowerStatement, *, ascii_only: bool) -> Iterator[RenderableType]:
    def text(words: str, style: str = "") -> Text:
        return Text(in_ascii(words) if ascii_only else words, style)

    if not statement.rows:
        yield text(NOTHING)
        return
    yield text("Power statement", "bold")
    yield text(_head(statement))
    yield ""
    yield _grid(statement, ascii_only=ascii_only)
    for each in statement.ratios:
        yield text(
            f"Channel {each.channel}, {each.at}: {figure(each.ratio, 'times')} the power into {each.over_ohm:g} Ω as "
            f"into {each.under_ohm:g} Ω"
        )
    yield ""
    yield text(paragraph(statement))
    notes = list(dict.fromkeys(sentence(note) for row in statement.rows for note in row.notes))
    if notes:
        yield ""
        yield from (Padding(text(f"Note: {words}"), (0, 0, 0, 2)) for words in notes)
    if statement.conditions:
        yield ""
        yield text("Conditions, each ticked off by itself; read the text before relying on any", "bold")
    for condition in statement.conditions:
        mark = {"done": "[x]", "not done": "[ ]"}.get(condition.tick.value, "[?]")
        remark = f" ({condition.remark})" if condition.remark else ""
        yield Padding(text(f"{mark} {condition.rule}: {condition.asks}{remark}"), (0, 0, 0, 2))
    yield ""
    yield text(ONSET_DEFINITION)


def _head(statement: PowerStatement) -> str:
    plan = statement.plan
    to = "total" if plan.reference is Reference.TOTAL else "fundamental"
    return (
        f"Tone {plan.frequency_hz:g} Hz; band {plan.low_hz:g} Hz to {plan.high_hz:g} Hz; THD+N to the {to}; ± at 95 %"
    )


def _grid(statement: PowerStatement, *, ascii_only: bool) -> Table:
    def cell(words: str) -> Text:
        return Text(in_ascii(words) if ascii_only else words)

    grid = Table(box=None, padding=(0, 2, 0, 0), header_style="bold", pad_edge=False)
    for name in ("Ch", "Load", "Driven", "Supply", "At", "V rms", "Power", "Held"):
        grid.add_column(name, justify="left", no_wrap=name in {"At", "Ch", "Load"})
    for stated in statement.rows:
        for point in stated.points:
            grid.add_row(*(cell(words) for words in _cells(statement, stated, point)))
    return grid


def _cells(statement: PowerStatement, stated: StatedRow, point: StatedPoint) -> tuple[str, ...]:
    row, supply_v = stated.row, statement.plan.supply_v
    held = "momentary" if point.held_s == 0.0 else f"{point.held_s:g} s"
    return (
        str(row.channel),
        f"{row.load.ohm:.4g} Ω",
        ",".join(str(channel) for channel in row.driven),
        "–" if supply_v is None else f"{supply_v:g} V",
        point.at,
        figure(point.voltage_vrms, "V"),
        figure(point.power_w, "W"),
        "–" if point.power_w is None else held,
    )
