"""The drawings of a power statement: THD+N against power, residuals, spectra over the interface's own floor."""

import math
from collections.abc import Sequence

import numpy as np

from wattproof.core.rounding import expanded
from wattproof.core.units import db
from wattproof.dsp.sources import stated95
from wattproof.procedures.statement import CurveReading, PowerStatement, StatedRow
from wattproof.report.plot_svg import ACCENT, SHADE, Axis, Plot, decades
from wattproof.report.session_content import PointPicture

_STYLES = (("", "disc"), ("7 4", "square"), ("2 3", "ring"), ("9 3 2 3", "cross"))
_LOWEST_DB = -160.0
_SPECTRUM_TICKS_DB = tuple(float(at) for at in range(-160, 1, 20))
_ROOM = 1.25


def curve_svg(statement: PowerStatement) -> str:
    """Return THD+N against power for every row, the points with their 95 % intervals."""
    counted = [each for each in statement.curve if not each.left_out and each.point and each.reading.power_w]
    watts = [each.reading.power_w.value for each in counted if each.reading.power_w]
    percents = [100.0 * each.point.thdn for each in counted if each.point]
    if not counted:
        return ""
    x = _log_axis("output power, W", min(watts), max(watts))
    y = _log_axis("THD+N, %", min(percents), max(percents))
    plot = Plot(x, y, "THD+N against output power")
    for at in (1.0, 10.0):
        if y.low < at < y.high:
            plot.across(at, f"{at:g} %")
    keys = []
    for stated, (dash, shape) in zip(statement.rows, _STYLES * 2, strict=False):
        own = [each for each in counted if each.number == stated.row.index]
        for stroke in sorted({each.mark.stroke for each in own}):
            _curve(plot, [each for each in own if each.mark.stroke == stroke], dash, weight=1.6 if stroke == 0 else 0.8)
        _points(plot, stated, shape)
        keys.append((dash, shape, f"channel {stated.row.channel} into {stated.row.load.ohm:.4g} Ω"))
    plot.key(keys)
    return plot.svg(
        f"{len(counted)} readings from {min(watts):.3g} W to {max(watts):.3g} W; the statement's points are marked."
    )


def _curve(plot: Plot, readings: Sequence[CurveReading], dash: str, weight: float) -> None:
    """Draw a curve over the band of its 95 % uncertainty in THD+N."""
    middle, upper, lower = [], [], []
    for each in sorted(readings, key=lambda one: one.reading.power_w.value if one.reading.power_w else 0.0):
        thdn, watts = each.reading.thdn, each.reading.power_w
        if thdn is None or watts is None:
            continue
        spread = 100.0 * expanded(thdn)
        percent = 100.0 * thdn.value
        middle.append((watts.value, percent))
        upper.append((watts.value, percent + spread))
        lower.append((watts.value, max(percent - spread, percent / 100.0)))
    plot.area(upper, lower, colour="#cfd6d9")
    plot.line(middle, dash=dash, weight=weight)


def _points(plot: Plot, stated: StatedRow, shape: str) -> None:
    for point in stated.points:
        if point.power_w is None or point.thdn is None:
            continue
        percent = 100.0 * point.thdn.value
        interval = stated95(point.power_w)
        plot.line([(max(interval.low, 1e-9), percent), (interval.high, percent)], weight=3.2, colour=ACCENT)
        plot.marks([(point.power_w.value, percent)], shape, colour=ACCENT)


def _log_axis(label: str, low: float, high: float) -> Axis:
    first, last = low / _ROOM, high * _ROOM
    return Axis(label, first, last, log=True, ticks=decades(first, last))


def residual_svg(shown: PointPicture) -> str:
    """Return two periods of the output and of what is left without its fundamental, the latter enlarged."""
    picture = shown.picture
    peak = float(np.max(np.abs(picture.residual))) or 1.0
    gain = 10.0 ** math.floor(math.log10(0.9 / peak)) if peak < 0.9 else 1.0
    gain *= next((step for step in (5.0, 2.0) if gain * step * peak <= 0.95), 1.0)
    x = Axis("periods of the tone", 0.0, 2.0, ticks=(0.0, 0.5, 1.0, 1.5, 2.0))
    y = Axis("ratio to the fundamental's peak", -1.3, 1.3, ticks=(-1.0, -0.5, 0.0, 0.5, 1.0))
    plot = Plot(x, y, f"Waveform and residual, {shown.at}", width=330.0, height=250.0)
    plot.line(_thinned(picture.phase_cycles, picture.output), weight=0.9, dash="3 2")
    plot.line(_thinned(picture.phase_cycles, gain * picture.residual), weight=1.5)
    plot.head(f"dashed: output; solid: residual × {gain:g}")
    return plot.svg(f"The residual's peak is {100.0 * peak:.3g} % of the fundamental's.")


def spectrum_svg(shown: PointPicture) -> str:
    """Return the harmonics and the noise between them, over the interface's own floor."""
    picture = shown.picture
    x = Axis("frequency, Hz", 20.0, 24_000.0, log=True, ticks=(20.0, 100.0, 1000.0, 10_000.0, 20_000.0), text=_hertz)
    y = Axis("dB to the fundamental", _LOWEST_DB, 0.0, ticks=_SPECTRUM_TICKS_DB)
    plot = Plot(x, y, f"Spectrum, {shown.at}", width=330.0, height=250.0)
    if shown.floor is not None:
        floor = [(float(hz), _db(ratio)) for hz, ratio in zip(shown.floor.frequency_hz, shown.floor.ratio, strict=True)]
        plot.area(floor, [(hz, _LOWEST_DB) for hz, _ in floor], colour=SHADE)
        plot.line(floor, weight=0.6)
    lines = [(float(hz), _db(ratio)) for hz, ratio in zip(picture.spectrum_hz, picture.spectrum_ratio, strict=True)]
    plot.line([point for point in lines if x.low <= point[0] <= x.high], weight=0.7)
    reading = picture.reading
    first = reading.fundamental_hz.value if reading.fundamental_hz else 0.0
    plot.stems([(first, 0.0)], weight=2.2)
    plot.stems([(each.frequency_hz, _db(each.ratio.value)) for each in reading.harmonics if each.remark is None])
    return plot.svg("Stems: fundamental and harmonics; line: noise; shaded: the interface's own noise.")


def _thinned(
    x: "np.ndarray[tuple[int], np.dtype[np.float64]]", y: "np.ndarray[tuple[int], np.dtype[np.float64]]"
) -> list[tuple[float, float]]:
    step = max(1, x.size // 400)
    return [(float(a), float(b)) for a, b in zip(x[::step], y[::step], strict=True)]


def _db(ratio: float) -> float:
    return max(db(float(ratio)), _LOWEST_DB)


def _hertz(value: float) -> str:
    return f"{value / 1000:g}k" if value >= 1000.0 else f"{value:g}"
