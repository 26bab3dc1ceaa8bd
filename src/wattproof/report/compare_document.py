"""Sessions side by side: a document for programs, a table for people, and their curves in one drawing.

The contract of the document, version 1:

    {"wattproof": "compare", "version": 1, "first": name, "comparisons": [{"second": name, "points": [
     {"channel", "load_ohm", "at", "first_w": Q, "second_w": Q, "power_ratio": Q, "ratio_low", "ratio_high",
      "differs": bool}]}]}

Q is {"value", "u", "unit"}. `ratio_low` and `ratio_high` are the ends of the 95 % interval of second over first,
in which what both share cancels; `differs` says that 1 lies outside.
"""

import math
from collections.abc import Iterator, Sequence

from wattproof.core.quantity import Quantity
from wattproof.core.rounding import stated
from wattproof.procedures.comparing import Compared, Sitting
from wattproof.report.characters import printable
from wattproof.report.plot_svg import Axis, Plot, decades

_DASHES = (("", "disc"), ("7 4", "square"), ("2 3", "ring"), ("9 3 2 3", "cross"))
_SIGNS = ("not shown to differ", "differs")


def compare_document(first: Sitting, others: Sequence[tuple[Sitting, Sequence[Compared]]]) -> dict[str, object]:
    """Return the document of one session against others."""
    return {
        "wattproof": "compare",
        "version": 1,
        "first": printable(first.name),
        "comparisons": [
            {"second": printable(other.name), "points": [_point(each) for each in points]} for other, points in others
        ],
    }


def _point(each: Compared) -> dict[str, object]:
    return {
        "channel": each.channel,
        "load_ohm": each.load_ohm,
        "at": each.at,
        "first_w": _q(each.first),
        "second_w": _q(each.second),
        "power_ratio": _q(each.power_ratio),
        "ratio_low": each.interval.low,
        "ratio_high": each.interval.high,
        "differs": each.differs,
    }


def _q(quantity: Quantity) -> dict[str, object]:
    return {"value": quantity.value, "u": quantity.u, "unit": quantity.unit}


def compare_lines(first: Sitting, other: Sitting, points: Sequence[Compared]) -> Iterator[str]:
    """Yield the table of one session against another."""
    yield f"{printable(other.name)} against {printable(first.name)}"
    if not points:
        yield "  they have no point in common: same channel, same load, same THD+N"
        return
    yield f"  {'Ch':<4}{'Load':<9}{'At':<8}{'First':<22}{'Second':<22}{'Second/first':<26}"
    for each in points:
        low, high = (_db(end) for end in (each.interval.low, each.interval.high))
        change = f"{_db(each.power_ratio.value):+.3f} dB ({low:+.3f} to {high:+.3f})"
        place = f"  {each.channel:<4}{f'{each.load_ohm:g} Ω':<9}{each.at:<8}"
        cells = f"{place}{stated(each.first):<22}{stated(each.second):<22}"
        yield f"{cells}{change:<34}{_SIGNS[each.differs]}"
    yield "  intervals are at 95 %; what both share (calibration, load, attenuator) cancels in the ratio"


def _db(power_ratio: float) -> float:
    return 10.0 * math.log10(power_ratio) if power_ratio > 0.0 else -math.inf


def overlaid_svg(sittings: Sequence[Sitting]) -> str:
    """Return the curves of all sessions in one drawing; empty where none has a curve."""
    curves = [(sitting, _curve(sitting)) for sitting in sittings]
    everything = [point for _, points in curves for point in points]
    if not everything:
        return ""
    watts, percents = [watts for watts, _ in everything], [percent for _, percent in everything]
    x = Axis("output power, W", min(watts), max(watts), log=True, ticks=decades(min(watts), max(watts)))
    y = Axis("THD+N, %", min(percents), max(percents), log=True, ticks=decades(min(percents), max(percents)))
    plot = Plot(x, y, "THD+N against output power")
    keys = []
    for (sitting, points), (dash, _) in zip(curves, _DASHES * (1 + len(curves) // 4), strict=False):
        plot.line(sorted(points), dash=dash)
        keys.append((dash, "none", sitting.name))
    plot.key(keys)
    return plot.svg("; ".join(sitting.name for sitting in sittings))


def _curve(sitting: Sitting) -> list[tuple[float, float]]:
    counted = (each for each in sitting.statement.curve if each.point and not each.left_out)
    return [
        (each.reading.power_w.value, 100.0 * each.point.thdn) for each in counted if each.reading.power_w and each.point
    ]
