"""Where everything stands in a window of a given size: small windows drop context before content. Pure."""

import attrs

_FULL = (1920, 1080)
_LEAST_SCALE, _MOST_SCALE = 0.5, 3.0
_ROOMY_SCALE = 0.62  # below this, the stations' second lines, the foot and the plots' remarks go

Box = tuple[int, int, int, int]  # left, top, width, height


@attrs.frozen
class Plan:
    """The boxes of the window's parts, in pixels, and what is dropped."""

    scale: float
    compact: bool
    chain: Box
    thdn: Box
    power: Box
    level: Box
    frequency: Box
    verdict: Box
    trail: Box
    residual: Box
    spectrum: Box
    panel: Box
    sheet: Box  # where a task's own sheet takes the place of reading and plots
    foot: Box


def plan_for(width: int, height: int) -> Plan:
    """Return the plan for a window's inside."""
    scale = min(max(min(width / _FULL[0], height / _FULL[1]), _LEAST_SCALE), _MOST_SCALE)
    compact = scale < _ROOMY_SCALE
    margin = round(36 * scale)
    chain_height = round((160 if compact else 172) * scale)
    foot_height = 0 if compact else max(20, round(34 * scale))
    panel_width = max(252, round(392 * scale))
    left, right = margin, width - panel_width - margin
    top, bottom = chain_height + round(16 * scale), height - foot_height - round((16 if compact else 10) * scale)
    gap = round(28 * scale)
    low_height = round((bottom - top) * (0.34 if compact else 0.345))
    middle = bottom - low_height - round(16 * scale)
    reading = max(round(520 * scale), round((right - left) * 0.365))
    column = _reading_column((left, top, reading, middle - top), scale, compact=compact)
    trail_left = left + reading + gap
    half = (right - left - gap // 2) // 2
    return Plan(
        scale,
        compact,
        (0, 0, width, chain_height),
        *column,
        (trail_left, top, right - trail_left, middle - top),
        (left - round(30 * scale), middle + round(16 * scale), half + round(30 * scale), low_height),
        (right - half, middle + round(16 * scale), half, low_height),
        (right + round(26 * scale), top, width - right - round(26 * scale) - margin // 2, bottom - top),
        (left, top, right - left, bottom - top),
        (left, height - foot_height, width - 2 * margin, foot_height),
    )


def _reading_column(box: Box, scale: float, *, compact: bool) -> tuple[Box, Box, Box, Box, Box]:
    """Share the reading's column: THD+N, power, level and frequency side by side, the sentence."""
    left, top, width, height = box
    shares = (0.29, 0.24, 0.195, 0.275) if compact else (0.32, 0.255, 0.2, 0.225)
    gap = round(10 * scale)
    heights = [round(share * (height - 3 * gap)) for share in shares]
    tops = [top]
    for part in heights[:-1]:
        tops.append(tops[-1] + part + gap)
    half = round(0.55 * width)
    return (
        (left, tops[0], width, heights[0]),
        (left, tops[1], width, heights[1]),
        (left, tops[2], half - gap, heights[2]),
        (left + half, tops[2], width - half, heights[2]),
        (left, tops[3], width, top + height - tops[3]),
    )
