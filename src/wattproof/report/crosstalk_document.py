"""Crosstalk both ways: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "crosstalk", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "ways": [{"driven": 1, "into": 2, "load_ohm": x,
       "points": [{"frequency_hz": x, "ratio": Q, "crosstalk_db": x, "u_db": x,
         "limited_by": null | "noise" | "interface"}],
       "notes": [sentences]}],
     "notes": [sentences]}

Q is {"value", "u", "unit", "limited_by"}, u the standard uncertainty. `ratio` is the voltage of the channel that is not
driven over that of the driven one, `crosstalk_db` the same in dB (separation is that with the other sign).
Where `limited_by` is no null, the truth does not exceed the figure.
"""

from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.core.wording import sentence
from wattproof.procedures.crosstalk import CrosstalkPoint, CrosstalkResult, CrosstalkWay
from wattproof.report.quantities import Document, Frame, db_cell, envelope, q
from wattproof.report.sheet import Grid, Sheet


def crosstalk_document(result: CrosstalkResult, frame: Frame) -> Document:
    """Return the document of one run of `crosstalk`."""
    notes = [*result.said, *(each for way in result.ways for each in way.notes)]
    return envelope(frame, {"ways": [_way(each) for each in result.ways]}, notes)


def _way(way: CrosstalkWay) -> Document:
    return {
        "driven": way.driven.channel,
        "into": way.into.channel,
        "load_ohm": way.driven.load.ohm,
        "points": [_point(each) for each in way.points],
        "notes": [sentence(each) for each in way.notes],
    }


def _point(point: CrosstalkPoint) -> Document:
    return {
        "frequency_hz": point.frequency_hz,
        "ratio": q(point.ratio),
        "crosstalk_db": db(point.ratio.value),
        "u_db": DB_PER_RELATIVE * point.ratio.u / point.ratio.value,
        "limited_by": point.ratio.limited_by,
    }


def crosstalk_sheet(result: CrosstalkResult) -> Sheet:
    """Return the page of one run of `crosstalk`."""
    grids = []
    for way in result.ways:
        rows = tuple((f"{point.frequency_hz:.5g} Hz", db_cell(point.ratio)) for point in way.points)
        grids.append(
            Grid(f"From channel {way.driven.channel} into {way.into.channel}", ("Frequency", "Crosstalk"), rows)
        )
    notes = (*result.said, *(each for way in result.ways for each in way.notes))
    head = f"Driven channel at {result.plan.level_vrms:g} V rms, the other's input terminated; ± at 95 %"
    return Sheet("Crosstalk", head, tuple(grids), notes)
