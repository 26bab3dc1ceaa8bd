"""THD+N against frequency: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "frequency", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "curves": [{"channel": 1, "load_ohm": x, "band_hz": [lo, hi],
       "points": [{"frequency_hz": x, "level_vrms": Q | null,
       "thdn": Q | null, "thd": Q | null, "noise": Q | null, "harmonics_inside": n, "remark": null | "why"}],
       "notes": [sentences]}],
     "notes": [sentences]}

Q is {"value", "u", "unit", "limited_by"}, u the standard uncertainty. `thdn`, `thd` and `noise` are plain ratios (0.01
is 1 %) to the total in the band. `harmonics_inside` counts the harmonics of the tone that the band holds: where there
is none, `thdn` and `thd` are null, and `remark` says so.
"""

from wattproof.core.quantity import Quantity
from wattproof.core.wording import sentence
from wattproof.procedures.frequency import FrequencyCurve, FrequencyResult
from wattproof.report.quantities import Document, Frame, cell, envelope, q
from wattproof.report.sheet import Grid, Sheet


def frequency_document(result: FrequencyResult, frame: Frame) -> Document:
    """Return the document of one run of `frequency`."""
    notes = [*result.said, *(each for curve in result.curves for each in curve.notes)]
    return envelope(frame, {"curves": [_curve(result, each) for each in result.curves]}, notes)


def _curve(result: FrequencyResult, curve: FrequencyCurve) -> Document:
    return {
        "channel": curve.row.channel,
        "load_ohm": curve.row.load.ohm,
        "band_hz": [result.plan.low_hz, result.plan.high_hz],
        "points": [
            {
                "frequency_hz": point.frequency_hz,
                "level_vrms": q(point.level_vrms),
                "thdn": q(point.thdn),
                "thd": q(point.thd),
                "noise": q(point.noise),
                "harmonics_inside": point.harmonics_inside,
                "remark": point.remark or None,
            }
            for point in curve.points
        ],
        "notes": [sentence(each) for each in curve.notes],
    }


def frequency_sheet(result: FrequencyResult) -> Sheet:
    """Return the page of one run of `frequency`."""
    plan = result.plan
    head = f"Output {plan.level_vrms:g} V rms at every tone; band {plan.low_hz:g} Hz to {plan.high_hz:g} Hz; ± at 95 %"
    grids = []
    for curve in result.curves:
        rows = tuple(
            (
                f"{point.frequency_hz:.5g} Hz",
                cell(point.level_vrms),
                _percent(point.thdn),
                _percent(point.thd),
                _percent(point.noise),
                point.remark,
            )
            for point in curve.points
        )
        columns = ("Frequency", "V rms", "THD+N", "THD", "Noise", "")
        grids.append(Grid(f"Channel {curve.row.channel}, {curve.row.load.ohm:.4g} Ω", columns, rows))
    notes = (*result.said, *(each for curve in result.curves for each in curve.notes))
    return Sheet("THD+N against frequency", head, tuple(grids), notes)


def _percent(ratio: Quantity | None) -> str:
    return cell(None if ratio is None else ratio.scaled(100.0, "%"))
