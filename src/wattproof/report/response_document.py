"""Level and phase against frequency: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "response", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "curves": [{"channel": 1, "load_ohm": x, "relative_to": "997 Hz" | "flat", "level_vrms": Q | null,
       "stepped": [P, ..], "swept": [P, ..],
       "orders": [{"order": 2, "frequency_hz": x, "ratio": Q}],
       "minus_3_db": {"low_hz": Q | null, "high_hz": Q | null}, "peak": P | null, "notes": [sentences]}],
     "notes": [sentences]}

P is {"frequency_hz": x, "relative_db": x, "u_db": x, "power_ratio": x, "phase_deg": x | null, "u_deg": x | null}; Q is
{"value", "u", "unit", "limited_by"}; u is always the standard uncertainty. `relative_db` is the level over that at
997 Hz, or over the flat setting at the same frequency; `power_ratio` the same in power. `orders` come of a swept sine:
`frequency_hz` is the fundamental's, `ratio` the harmonic's to it as a plain ratio. `minus_3_db` is null where the curve
does not fall so far.
"""

from collections.abc import Sequence

from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.core.wording import sentence
from wattproof.procedures.response_result import OrderPoint, ResponseCurve, ResponsePoint, ResponseResult
from wattproof.report.quantities import Document, Frame, cell, envelope, q
from wattproof.report.sheet import Grid, Sheet

_SHOWN_ORDERS_HZ = (50.0, 100.0, 1_000.0, 5_000.0)


def response_document(result: ResponseResult, frame: Frame) -> Document:
    """Return the document of one run of `response`."""
    notes = [*result.said, *(each for curve in result.curves for each in curve.notes)]
    return envelope(frame, {"curves": [_curve(result, each) for each in result.curves]}, notes)


def _curve(result: ResponseResult, curve: ResponseCurve) -> Document:
    return {
        "channel": curve.row.channel,
        "load_ohm": curve.row.load.ohm,
        "relative_to": "flat" if result.plan.relative else "997 Hz",
        "level_vrms": q(curve.level_vrms),
        "stepped": [_point(each) for each in curve.stepped],
        "swept": [_point(each) for each in curve.swept],
        "orders": [
            {"order": each.order, "frequency_hz": each.frequency_hz, "ratio": q(each.ratio)} for each in curve.orders
        ],
        "minus_3_db": {"low_hz": q(curve.low_hz), "high_hz": q(curve.high_hz)},
        "peak": None if curve.peak is None else _point(curve.peak),
        "notes": [sentence(each) for each in curve.notes],
    }


def _point(point: ResponsePoint) -> Document:
    return {
        "frequency_hz": point.frequency_hz,
        "relative_db": db(point.relative.value),
        "u_db": DB_PER_RELATIVE * point.relative.u / point.relative.value,
        "power_ratio": point.power_ratio,
        "phase_deg": None if point.phase_deg is None else point.phase_deg.value,
        "u_deg": None if point.phase_deg is None else point.phase_deg.u,
    }


def response_sheet(result: ResponseResult) -> Sheet:
    """Return the page of one run of `response`."""
    plan = result.plan
    to = "the flat setting" if plan.relative else "the level at 997 Hz"
    head = f"Level {plan.level_vrms:g} V rms at 997 Hz; relative to {to}; ± at 95 %"
    grids = []
    for curve in result.curves:
        name = f"Channel {curve.row.channel}, {curve.row.load.ohm:.4g} Ω"
        for kind, points in (("stepped tones", curve.stepped), ("swept sine", curve.swept)):
            if points:
                grids.append(Grid(f"{name}, {kind}", ("Frequency", "dB", "power", "phase"), tuple(map(_row, points))))
        if curve.orders:
            grids.append(_orders(curve, name))
        ends = (("below", cell(curve.low_hz)), ("above", cell(curve.high_hz)))
        grids.append(Grid(f"{name}, -3 dB points", ("", "Hz"), ends))
    notes = (*result.said, *(each for curve in result.curves for each in curve.notes))
    return Sheet("Response", head, tuple(grids), notes)


def _row(point: ResponsePoint) -> tuple[str, str, str, str]:
    u95 = 2.0 * DB_PER_RELATIVE * point.relative.u / point.relative.value
    spread = f" ± {u95:.3f}" if u95 >= 0.0005 else ""
    phase = "–" if point.phase_deg is None else f"{point.phase_deg.value:+.1f}°"
    level = f"{db(point.relative.value):+.3f}{spread}".replace("-", "−")
    return f"{point.frequency_hz:.5g} Hz", level, f"× {point.power_ratio:.3g}", phase.replace("-", "−")


def _orders(curve: ResponseCurve, name: str) -> Grid:
    orders = sorted({each.order for each in curve.orders})
    rows = []
    for hz in _SHOWN_ORDERS_HZ:
        cells = [f"{hz:g} Hz"]
        for order in orders:
            own = [each for each in curve.orders if each.order == order]
            near = _nearest(own, hz)
            told = "–" if abs(near.frequency_hz / hz - 1.0) > 0.06 else f"{100.0 * near.ratio.value:.2g} %"
            cells.append(f"≤ {told}" if near.ratio.limited_by and told != "–" else told)
        rows.append(tuple(cells))
    return Grid(f"{name}, distortion by order", ("Fundamental", *(f"H{order}" for order in orders)), tuple(rows))


def _nearest(points: Sequence[OrderPoint], wanted_hz: float) -> OrderPoint:
    return min(points, key=lambda point: abs(point.frequency_hz / wanted_hz - 1.0))
