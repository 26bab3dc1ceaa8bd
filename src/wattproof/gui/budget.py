"""Opens a figure: the budget of its uncertainty, source by source, the largest first. Pure."""

import attrs

from wattproof.core.quantity import Quantity
from wattproof.core.rounding import expanded, t95
from wattproof.gui import figures, task_text

_LEAST_SHARE = 0.001  # of the variance: below it a source is not worth a line


@attrs.frozen
class Line:
    """One source: its name, its standard uncertainty in the figure's unit, and its share of the variance."""

    source: str
    u: str
    share: float


def lines_of(quantity: Quantity, factor: float = 1.0, unit: str = "") -> tuple[Line, ...]:
    """Return a figure's sources, the largest first; `factor` and `unit` are those in which the figure is shown."""
    whole = quantity.u**2
    if whole == 0.0:
        return ()
    unit = unit or quantity.unit
    parts = sorted(quantity.parts, key=lambda part: -abs(part.u))
    return tuple(
        Line(part.source, f"{figures.plus_minus(abs(part.u) * factor)} {unit}".strip(), part.u**2 / whole)
        for part in parts
        if part.u**2 / whole >= _LEAST_SHARE
    )


def words_of(label: str, quantity: Quantity) -> str:
    """Return a budget as rich text: the figure, how ± comes about, and a table of its sources."""
    per_cent = quantity.unit == "1"
    factor, unit = (100.0, "%") if per_cent else (1.0, quantity.unit)
    shown = figures.worded(quantity.value * factor, expanded(quantity) * factor, unit)
    head = f"<b>{label}</b>&nbsp; {shown.number} ± {shown.plus_minus or '0'} {unit}"
    how = task_text.COVERAGE.format(
        t=t95(quantity.dof), u=f"{figures.plus_minus(quantity.u * factor) or 0} {unit}", dof=_dof(quantity.dof)
    )
    rows = "".join(
        f"<tr><td>{line.source}&nbsp;&nbsp;</td><td align=right>{line.u}&nbsp;&nbsp;</td>"
        f"<td align=right>{100 * line.share:.0f} %</td></tr>"
        for line in lines_of(quantity, factor, unit)
    )
    table = f"<table><tr><td></td><td>u</td><td>{task_text.SHARE}</td></tr>{rows}</table>" if rows else task_text.EXACT
    limited = f"<p>{task_text.LIMITED_BY.format(what=quantity.limited_by)}</p>" if quantity.limited_by else ""
    return f"<p>{head}</p><p>{how}</p>{table}{limited}"


def _dof(dof: float) -> str:
    return "∞" if dof > 1e4 else f"{dof:.0f}"
