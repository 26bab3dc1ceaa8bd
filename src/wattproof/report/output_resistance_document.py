"""Output resistance and damping factor: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "output-resistance", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "curves": [{"channel": 1, "loads_ohm": [8.0, 4.0], "damping_at_ohm": 8.0, "drift": x,
       "points": [{"frequency_hz": x, "resistance_ohm": Q, "reactance_ohm": Q, "magnitude_ohm": Q,
         "damping": {"value": x, "low": x, "high": x | null, "words": "97 to 103" | "greater than 250"}}],
       "notes": [sentences]}],
     "notes": [sentences]}

Q is {"value", "u", "unit", "limited_by"}, u the standard uncertainty. `damping` is load over magnitude, with its
95 % interval; `high` is null where only a lower bound can be stated. `drift` is how far the first load's voltage had
moved when it was read once more at the end, as a plain ratio.
"""

import math

from wattproof.core.wording import sentence
from wattproof.procedures.output_resistance import ImpedanceCurve, ImpedancePoint, ImpedanceResult
from wattproof.report.quantities import Document, Frame, cell, envelope, q
from wattproof.report.sheet import Grid, Sheet


def output_resistance_document(result: ImpedanceResult, frame: Frame) -> Document:
    """Return the document of one run of `output-resistance`."""
    notes = [*result.said, *(each for curve in result.curves for each in curve.notes)]
    return envelope(frame, {"curves": [_curve(result, each) for each in result.curves]}, notes)


def _curve(result: ImpedanceResult, curve: ImpedanceCurve) -> Document:
    return {
        "channel": curve.row.channel,
        "loads_ohm": list(result.plan.guarded().loads_ohm),
        "damping_at_ohm": curve.load_ohm,
        "drift": curve.drift,
        "points": [_point(each) for each in curve.points],
        "notes": [sentence(each) for each in curve.notes],
    }


def _point(point: ImpedancePoint) -> Document:
    damping = point.damping
    return {
        "frequency_hz": point.frequency_hz,
        "resistance_ohm": q(point.impedance.resistance),
        "reactance_ohm": q(point.impedance.reactance),
        "magnitude_ohm": q(point.impedance.magnitude),
        "damping": {
            "value": damping.value if math.isfinite(damping.value) else None,
            "low": damping.low,
            "high": damping.high,
            "words": damping.words,
        },
    }


def output_resistance_sheet(result: ImpedanceResult) -> Sheet:
    """Return the page of one run of `output-resistance`."""
    grids = []
    for curve in result.curves:
        rows = tuple(
            (
                f"{point.frequency_hz:.5g} Hz",
                cell(point.impedance.resistance),
                cell(point.impedance.reactance),
                point.damping.words,
            )
            for point in curve.points
        )
        columns = ("Frequency", "Resistance", "Reactance", f"Damping factor at {curve.load_ohm:g} Ω")
        grids.append(Grid(f"Channel {curve.row.channel}", columns, rows))
    notes = (*result.said, *(each for curve in result.curves for each in curve.notes))
    loads = " and ".join(f"{ohm:g}" for ohm in result.plan.guarded().loads_ohm)
    return Sheet("Output resistance", f"From loads of {loads} Ω at one drive; ± at 95 %", tuple(grids), notes)
