"""Efficiency and heat: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "efficiency", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "driven": [1, 2], "load_ohm": x,
     "points": [{"level_vrms": x, "output_w": Q, "supply_v": x, "supply_a": x, "supply_w": Q, "efficiency": Q,
       "heat_w": Q}],
     "notes": [sentences]}

Q is {"value", "u", "unit", "limited_by"}, u the standard uncertainty. `output_w` is the sum of the driven channels,
`efficiency` a plain ratio, `heat_w` what is left of the supply's power in the amplifier.
"""

from wattproof.core.quantity import Quantity
from wattproof.procedures.efficiency import EfficiencyPoint, EfficiencyResult
from wattproof.report.quantities import Document, Frame, cell, envelope, q
from wattproof.report.sheet import Grid, Sheet


def efficiency_document(result: EfficiencyResult, frame: Frame) -> Document:
    """Return the document of one run of `efficiency`."""
    content: Document = {
        "driven": list(result.rows[0].driven),
        "load_ohm": result.rows[0].load.ohm,
        "points": [_point(each) for each in result.points],
    }
    return envelope(frame, content, result.notes)


def _point(point: EfficiencyPoint) -> Document:
    return {
        "level_vrms": point.level_vrms,
        "output_w": q(point.output_w),
        "supply_v": point.supply_v,
        "supply_a": point.supply_a,
        "supply_w": q(point.supply_w),
        "efficiency": q(point.balance.efficiency),
        "heat_w": q(point.balance.heat_w),
    }


def efficiency_sheet(result: EfficiencyResult) -> Sheet:
    """Return the page of one run of `efficiency`."""
    rows = tuple(
        (
            f"{point.level_vrms:g} V",
            cell(point.output_w),
            f"{point.supply_v:.4g} V, {point.supply_a:.4g} A",
            cell(point.supply_w),
            _percent(point.balance.efficiency),
            cell(point.balance.heat_w),
        )
        for point in result.points
    )
    driven = ", ".join(str(channel) for channel in result.rows[0].driven)
    columns = ("Each channel", "Output", "Supply", "Supply power", "Efficiency", "Heat")
    head = f"Channels driven: {driven}; {result.rows[0].load.ohm:.4g} Ω each; ± at 95 %"
    return Sheet("Efficiency", head, (Grid("", columns, rows),), result.notes)


def _percent(ratio: Quantity) -> str:
    return cell(ratio.scaled(100.0, "%"))
