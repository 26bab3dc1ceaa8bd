"""The columns of exported tables: the unit in each name, and what it means in a dictionary beside the table."""

from collections.abc import Callable, Mapping

import attrs

from wattproof.core.quantity import Quantity
from wattproof.procedures.requests import Kept
from wattproof.procedures.statement import StatedPoint, StatedRow

Cell = str | float | int | None


@attrs.frozen
class Origin:
    """Where a row comes from: session, run, and its number in it."""

    session: str
    device: str
    serial: str
    run: int
    procedure: str
    at: str


_ORIGIN = {
    "session": "name of the session file",
    "device": "amplifier, as its plate says",
    "serial": "its serial number",
    "run": "run of the session, from 1",
    "procedure": "name of the procedure",
    "begun_utc": "when the run was begun, ISO 8601 in UTC",
}
_QUANTITIES: Mapping[str, tuple[str, str]] = {
    "fundamental_hz": ("Hz", "frequency of the fundamental"),
    "fundamental_fs": ("1", "level of the fundamental, rms to that of a full-scale sine"),
    "level_fs": ("1", "level in all, rms to that of a full-scale sine"),
    "level_vrms": ("V rms", "voltage at the amplifier's terminals"),
    "power_w": ("W", "power in the load"),
    "thdn": ("1", "THD+N, plain ratio to the run's reference"),
    "thd": ("1", "THD, plain ratio to the run's reference"),
    "noise": ("1", "noise, plain ratio to the run's reference"),
    "hum": ("1", "hum, plain ratio to the run's reference"),
}
_NAMES = {"thdn": "thdn_ratio", "thd": "thd_ratio", "noise": "noise_ratio", "hum": "hum_ratio"}


def _meaning(unit: str, meaning: str) -> dict[str, str]:
    return {"unit": unit, "meaning": meaning}


def _with_u(names: Mapping[str, tuple[str, str]]) -> dict[str, dict[str, str]]:
    found = {}
    for name, (unit, meaning) in names.items():
        column = _NAMES.get(name, name)
        found[column] = _meaning(unit, meaning)
        found[f"u_{column}"] = _meaning(unit, f"standard uncertainty of {column}")
    return found


READING_DICTIONARY: Mapping[str, Mapping[str, str]] = {
    **{name: _meaning("", meaning) for name, meaning in _ORIGIN.items()},
    "number": _meaning("", "reading of the run, from 1"),
    "row": _meaning("", "row of the statement, from 0"),
    "channel": _meaning("", "captured input, from 1"),
    "load_ohm": _meaning("Ω", "resistance that took the power"),
    "role": _meaning("", "what the reading is for: step, stroke, held, check"),
    "point": _meaning("", "point that was held"),
    "stroke": _meaning("", "stroke of the hand, from 0"),
    "held_s": _meaning("s", "how long the point was held when the reading ended"),
    "drive_fs_ratio": _meaning("1", "drive to full scale"),
    "start_s": _meaning("s", "begin of the reading, from the opening of the bench"),
    "length_s": _meaning("s", "length of the reading"),
    "state": _meaning("", "whether it could be read"),
    **_with_u(_QUANTITIES),
}
POINT_DICTIONARY: Mapping[str, Mapping[str, str]] = {
    **{name: _meaning("", meaning) for name, meaning in _ORIGIN.items()},
    "channel": _meaning("", "channel of the amplifier, from 1"),
    "load_ohm": _meaning("Ω", "resistance that took the power"),
    "point": _meaning("", "onset of clipping, or the THD+N of the point"),
    "held_s": _meaning("s", "how long it was held; 0: momentary"),
    **_with_u({name: _QUANTITIES[name] for name in ("level_vrms", "power_w", "thdn")}),
}


def reading_row(origin: Origin, number: int, kept: Kept) -> dict[str, Cell]:
    """Return one reading as a row of READING_DICTIONARY's columns."""
    reading, mark = kept.reading, kept.mark
    row: dict[str, Cell] = {
        **_origin(origin),
        "number": number,
        "row": None if mark is None else mark.row,
        "channel": reading.channel,
        "load_ohm": reading.settings.load_ohm,
        "role": None if mark is None else mark.role.value,
        "point": None if mark is None else mark.at or None,
        "stroke": None if mark is None else mark.stroke,
        "held_s": None if mark is None else mark.held_s,
        "drive_fs_ratio": None if mark is None else mark.drive_fs,
        "start_s": reading.span.start_s,
        "length_s": reading.span.seconds,
        "state": reading.state.value,
    }
    return row | _quantities(lambda name: getattr(reading, name), tuple(_QUANTITIES))


def point_row(origin: Origin, stated: StatedRow, point: StatedPoint) -> dict[str, Cell]:
    """Return one point of a statement as a row of POINT_DICTIONARY's columns."""
    row: dict[str, Cell] = {
        **_origin(origin),
        "channel": stated.row.channel,
        "load_ohm": stated.row.load.ohm,
        "point": point.at,
        "held_s": point.held_s,
    }
    values = {"level_vrms": point.voltage_vrms, "power_w": point.power_w, "thdn": point.thdn}
    return row | _quantities(values.__getitem__, tuple(values))


def _origin(origin: Origin) -> dict[str, Cell]:
    return dict(zip(_ORIGIN, attrs.astuple(origin), strict=True))


def _quantities(value_of: Callable[[str], Quantity | None], names: tuple[str, ...]) -> dict[str, Cell]:
    row: dict[str, Cell] = {}
    for name in names:
        quantity, column = value_of(name), _NAMES.get(name, name)
        row[column] = None if quantity is None else quantity.value
        row[f"u_{column}"] = None if quantity is None else quantity.u
    return row
