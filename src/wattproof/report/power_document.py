"""A power statement as the JSON document that programs rely on.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "power", "version": 1, "settings": {..}, "rig": {..}, "ending": "done" | "stopped" | "failed",
     "why": "" | "why it was stopped or failed",
     "statement": [{"channel": 1, "load_ohm": 8.0, "driven": [1], "supply_v": x|null, "claimed_w": x|null,
       "points": [{"at": "onset" | "1 %" | "10 %" | own, "voltage_vrms": Q|null, "power_w": Q|null, "thdn": Q|null,
         "held_s": x, "momentary_vrms": Q|null, "momentary_w": Q|null, "why": null | "why it has no value"}],
       "notes": [sentences]}],
     "ratios": [{"channel": 1, "at": "1 %", "over_ohm": 4.0, "under_ohm": 8.0, "power_ratio": Q}],
     "conditions": [{"rule", "asks", "tick": "done" | "not done" | "cannot be seen by the program", "remark"}],
     "curve": [{"row": 0, "stroke": 0, "at_s": x, "drive_dbfs": x|null, "voltage_vrms": x, "power_w": x, "thdn": x,
       "thd": x, "noise": x, "dominated": "noise" | "harmonics" | "both", "left_out": null | "jump" | "crackle"}],
     "notes": [sentences]}

Q is {"value", "u", "unit"} with u the standard uncertainty in the same unit. `settings` holds each declared field by
its name. `driven` are the channels that sounded while the row was read. `voltage_vrms`, `power_w` and `thdn` of a point
are held values where `held_s` is above 0, only those may be called continuous; `momentary_*` are what the curve gave
before. `thdn` is a plain ratio: 0.01 is 1 %. `row` counts the rows of the run from 0.
"""

import math
from collections.abc import Mapping, Sequence
from enum import Enum

import attrs

from wattproof.core.notes import Note
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.core.units import db
from wattproof.core.wording import sentence
from wattproof.procedures.statement import CurveReading, LoadRatio, PowerStatement, StatedPoint, StatedRow
from wattproof.report.characters import printable

VERSION = 1
Document = dict[str, object]


def power_document(statement: PowerStatement, rig: Rig, ending: Ending, why: str = "") -> Document:
    """Return the document of one power statement."""
    notes = [sentence(each) for row in statement.rows for each in row.notes]
    return {
        "wattproof": "power",
        "version": VERSION,
        "settings": _plain(attrs.asdict(statement.plan)),
        "rig": _plain(attrs.asdict(rig)),
        "ending": ending.value,
        "why": printable(why),
        "statement": [_row(row, statement) for row in statement.rows],
        "ratios": [_ratio(each) for each in statement.ratios],
        "conditions": [
            {"rule": each.rule, "asks": each.asks, "tick": each.tick.value, "remark": each.remark}
            for each in statement.conditions
        ],
        "curve": [_on_curve(each) for each in statement.curve if each.reading.level_vrms is not None],
        "notes": list(dict.fromkeys(notes)),
    }


def _row(stated: StatedRow, statement: PowerStatement) -> Document:
    return {
        "channel": stated.row.channel,
        "load_ohm": stated.row.load.ohm,
        "driven": list(stated.row.driven),
        "supply_v": statement.plan.supply_v,
        "claimed_w": statement.plan.claimed_w,
        "points": [_point(point) for point in stated.points],
        "notes": [sentence(each) for each in stated.notes],
    }


def _point(point: StatedPoint) -> Document:
    return {
        "at": point.at,
        "voltage_vrms": _q(point.voltage_vrms),
        "power_w": _q(point.power_w),
        "thdn": _q(point.thdn),
        "held_s": round(point.held_s, 6),
        "momentary_vrms": _q(point.momentary_vrms),
        "momentary_w": _q(point.momentary_w),
        "why": _why(point.why),
    }


def _why(why: Note | None) -> str | None:
    return None if why is None else sentence(why)


def _ratio(each: LoadRatio) -> Document:
    return {
        "channel": each.channel,
        "at": each.at,
        "over_ohm": each.over_ohm,
        "under_ohm": each.under_ohm,
        "power_ratio": _q(each.ratio),
    }


def _on_curve(each: CurveReading) -> Document:
    reading, point = each.reading, each.point
    return {
        "row": each.number,
        "stroke": each.mark.stroke,
        "at_s": reading.span.start_s,
        "drive_dbfs": db(each.mark.drive_fs) if each.mark.drive_fs > 0.0 else None,
        "voltage_vrms": _value(reading.level_vrms),
        "power_w": _value(reading.power_w),
        "thdn": _value(reading.thdn),
        "thd": _value(reading.thd),
        "noise": _rest(reading),
        "dominated": None if point is None else point.dominated.value,
        "left_out": each.left_out or None,
    }


def _rest(reading: Reading) -> float | None:
    parts = [part.value for part in (reading.noise, reading.hum) if part is not None]
    return math.hypot(*parts) if parts else None


def _value(quantity: Quantity | None) -> float | None:
    return None if quantity is None else quantity.value


def _q(quantity: Quantity | None) -> Document | None:
    return None if quantity is None else {"value": quantity.value, "u": quantity.u, "unit": quantity.unit}


def _plain(value: object) -> object:
    """Return a value made of what JSON has: enumerations by their value, quantities as Q, nothing infinite."""
    match value:
        case Mapping():
            return {str(key): _plain(each) for key, each in value.items()}
        case Enum():
            return value.value
        case str():
            return printable(value)
        case float() if not math.isfinite(value):
            return None
        case Sequence():
            return [_plain(each) for each in value]
        case _:
            return value if value is None or isinstance(value, bool | int | float) else printable(str(value))
