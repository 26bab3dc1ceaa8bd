"""The power statement as the window shows it while it is built: rows, cells and marks, in words. Pure."""

import attrs

from wattproof.core.quantity import Quantity
from wattproof.core.wording import sentence
from wattproof.gui import figures, task_text
from wattproof.gui.guided import Guided
from wattproof.gui.readout import Figure, Readout, Withheld
from wattproof.gui.sentence import Sentence
from wattproof.gui.trail import OPEN_OHM, PointMark
from wattproof.procedures.power_plan import ONE_PER_CENT, ONSET
from wattproof.procedures.power_rows import Row
from wattproof.procedures.statement import StatedPoint, StatedRow
from wattproof.report.power_words import paragraph


@attrs.frozen
class Cell:
    """One point of one row: the watts, their ±, the volts, how it came about; `found` is False for a dash."""

    at: str
    watts: str
    unit: str = "W"
    spread: str = ""
    volts: str = ""
    how: str = ""
    held: bool = False
    found: bool = False
    quantity: Quantity | None = None  # the power's, whose budget opens


@attrs.frozen
class RowView:
    """One row of the table."""

    title: str
    cells: tuple[Cell, ...]
    current: bool = False


def rows_of(run: Guided) -> tuple[RowView, ...]:
    """Return the table as far as it is built."""
    return tuple(_row_view(run, row) for row in run.measurement.rows)


def _row_view(run: Guided, row: Row) -> RowView:
    name = row.wiring.name if row.wiring.name and row.channel <= len(run.measurement.place.rig.wirings) else ""
    title = task_text.row_title(row.load.ohm, name or f"channel {row.channel}", len(row.driven))
    stated = run.stated(row.index)
    names = [target.name for target in run.measurement.plan.targets]
    points = {point.at: point for point in stated.points} if stated is not None else {}
    over = run.over(row.index)
    cells = tuple(_cell(name, points.get(name), over=over) for name in names)
    return RowView(title, cells, current=run.running and row.index == run.row)


def _cell(name: str, point: StatedPoint | None, *, over: bool) -> Cell:
    if point is None or point.power_w is None or point.voltage_vrms is None:
        return Cell(name, task_text.NONE if over else task_text.NOT_YET)
    watts = figures.quantity(point.power_w, "W")
    volts = figures.quantity(point.voltage_vrms, "V")
    return Cell(
        name,
        watts.number,
        watts.unit,
        _spread(watts),
        f"{volts}",
        task_text.held(point.held_s),
        held=point.held_s > 0.0,
        found=True,
        quantity=point.power_w,
    )


def _spread(shown: figures.Worded) -> str:
    """Return ± in words; "" where it lies below the last digit shown."""
    written = shown.plus_minus and not shown.plus_minus.startswith("<")
    return f"± {shown.plus_minus}" if written else ""


def remarks_of(run: Guided) -> tuple[str, ...]:
    """Return everything that was found out besides the figures, in sentences, once each."""
    found: list[str] = []
    for row in run.measurement.rows:
        stated = run.stated(row.index)
        if stated is not None:
            found += [task_text.doing(note) for note in stated.notes]
    return tuple(dict.fromkeys(found))


def spoken_of(run: Guided) -> str:
    """Return the statement in plain language, "" while nothing is stated."""
    if run.statement is None or not run.statement.rows:
        return ""
    return paragraph(run.statement)


def conditions_of(run: Guided) -> tuple[str, ...]:
    """Return the conditions of a published rule that were asked for, each with its tick."""
    if run.statement is None:
        return ()
    ticks = {"done": "✓", "not done": "–"}
    return tuple(
        f"{ticks.get(each.tick.value, '?')}  {each.rule}: {each.asks}"
        + (f" ({each.tick.value})" if each.tick.value not in ticks else "")
        + (f" ({each.remark})" if each.remark else "")
        for each in run.statement.conditions
    )


def marks_of(stated: StatedRow | None) -> tuple[PointMark, ...]:
    """Return the marks of a row's points on its trail."""
    if stated is None:
        return ()
    by_power = stated.row.load.ohm < OPEN_OHM
    found = []
    for point in stated.points:
        along = point.power_w if by_power else point.voltage_vrms
        if along is None or point.thdn is None or point.power_w is None or point.voltage_vrms is None:
            continue
        found.append(PointMark(along.value, point.thdn.value, point.at, _mark_words(point), point.held_s > 0.0))
    return tuple(found)


def _mark_words(point: StatedPoint) -> str:
    watts, volts = figures.quantity(point.power_w, "W"), figures.quantity(point.voltage_vrms, "V")  # type: ignore[arg-type]  # marks_of looked

    def with_spread(shown: figures.Worded) -> str:
        return f"{shown.number} {_spread(shown)} {shown.unit}" if _spread(shown) else str(shown)

    return f"{with_spread(watts)} · {with_spread(volts)}"


def result_readout(run: Guided, words: Sentence) -> Readout | None:
    """Return the statement's figures large, for whoever stands two metres away; None where there are none."""
    stated = run.stated(run.row)
    if stated is None or not any(point.power_w is not None for point in stated.points):
        return None
    by_name = {point.at: point for point in stated.points}
    one = f"{100.0 * ONE_PER_CENT:g} %"
    others = [point for point in stated.points if point.at not in (one, ONSET)]
    about = task_text.row_title(stated.row.load.ohm, stated.row.wiring.name, len(stated.row.driven))
    claimed = run.measurement.plan.claimed_w
    claim = Figure(task_text.CLAIMED, f"{claimed:g}", "W", "") if claimed else _none(task_text.CLAIMED)
    return Readout(
        _figure(by_name.get(one), about),
        _figure(others[-1] if others else None, ""),
        _figure(by_name.get(ONSET), ""),
        claim,
        words,
    )


def _none(label: str) -> Figure:
    return Figure(label, figures.DASH, "", task_text.NOT_STATED, Withheld.DASH)


def _figure(point: StatedPoint | None, about: str) -> Figure:
    at = task_text.ONSET_WORDS if point is not None and point.at == ONSET else "" if point is None else point.at
    label = task_text.POINT_POWER.format(at=at)
    if point is None:
        return Figure(label, figures.DASH, "", "", Withheld.DASH)
    if point.power_w is None or point.voltage_vrms is None:
        return Figure(label, figures.DASH, "", "" if point.why is None else sentence(point.why), Withheld.DASH)
    watts = figures.quantity(point.power_w, "W")
    spread = f"{_spread(watts)} {watts.unit}" if _spread(watts) else ""
    volts = str(figures.quantity(point.voltage_vrms, "V"))
    how = [spread, task_text.held(point.held_s)]
    below = " · ".join(part for part in (how if about else [volts, *how]) if part)
    return Figure(
        label, watts.number, watts.unit, below, second=volts if about else "", about=about, quantity=point.power_w
    )
