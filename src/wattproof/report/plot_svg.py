"""Curves as drawings (SVG) that stand alone and read in black and white: axes, dashes, marks, bands, floors."""

import math
from collections.abc import Callable, Sequence
from html import escape

import attrs

INK, PAPER, GRID, SHADE, ACCENT = "#16222b", "#ffffff", "#d9dde0", "#e4e8ea", "#0b5560"
FONT = "Inter, Helvetica, Arial, sans-serif"
_LEFT, _RIGHT, _TOP, _BOTTOM = 58.0, 14.0, 12.0, 40.0
_MARK = 3.6
Points = Sequence[tuple[float, float]]


@attrs.frozen
class Axis:
    """One axis: its label with unit, the ends, whether it is logarithmic, and the values that are written on it."""

    label: str
    low: float
    high: float
    log: bool = False
    ticks: tuple[float, ...] = ()
    text: Callable[[float], str] = lambda value: f"{value:g}".replace("-", "\N{MINUS SIGN}")

    def share(self, value: float) -> float:
        """Return where a value lies, 0 at the low and 1 at the high end; what lies beyond stays at the end."""
        low, high, at = self.low, self.high, min(max(value, self.low), self.high)
        if self.log:
            low, high, at = math.log(low), math.log(high), math.log(at)
        return (at - low) / (high - low)


class Plot:
    """A drawing of `width` by `height`; what is added later lies above what was added before."""

    def __init__(self, x: Axis, y: Axis, title: str, *, width: float = 640.0, height: float = 330.0) -> None:
        self._x, self._y, self._title = x, y, title
        self._width, self._height = width, height
        self._body: list[str] = []

    def line(self, points: Points, *, dash: str = "", weight: float = 1.6, colour: str = INK) -> None:
        """Draw a line through points, in the order given."""
        if len(points) < 2:
            return
        style = f'fill="none" stroke="{colour}" stroke-width="{weight:g}" stroke-linejoin="round"'
        dashes = f' stroke-dasharray="{dash}"' if dash else ""
        self._body.append(f'<polyline points="{self._path(points)}" {style}{dashes}/>')

    def area(self, upper: Points, lower: Points, *, colour: str = SHADE) -> None:
        """Shade what lies between two lines of rising x."""
        if len(upper) > 1:
            self._body.append(f'<polygon points="{self._path([*upper, *reversed(lower)])}" fill="{colour}"/>')

    def stems(self, points: Points, *, weight: float = 1.6, colour: str = INK) -> None:
        """Draw a line from the bottom to each point."""
        for x, y in points:
            if self._x.low <= x <= self._x.high and y > self._y.low:
                at = self._at(x, y)
                foot = self._at(x, self._y.low)
                self._body.append(_segment(at, foot, colour, weight))

    def marks(self, points: Points, shape: str = "disc", *, colour: str = INK) -> None:
        """Draw a mark at each point: disc, ring, square or cross."""
        self._body += [_mark(*self._at(x, y), shape, colour) for x, y in points]

    def head(self, text: str) -> None:
        """Write a line inside, at the upper left."""
        self._body.append(_text(_LEFT + 8.0, _TOP + 14.0, text, halo=True))

    def across(self, y: float, text: str) -> None:
        """Draw a thin dashed line across, with its name at the left end."""
        left, right = self._at(self._x.low, y), self._at(self._x.high, y)
        self._body += [_segment(left, right, INK, 0.7, "2 3"), _text(left[0] + 5, left[1] - 4, text, size=10)]

    def key(self, entries: Sequence[tuple[str, str, str]]) -> None:
        """Write a key in the upper middle: (dash, mark, words)."""
        for number, (dash, shape, words) in enumerate(entries):
            top, left = _TOP + 34.0 + 17.0 * number, 0.3 * self._width
            self._body.append(_segment((left, top), (left + 30.0, top), INK, 1.6, dash))
            self._body.append(_mark(left + 15.0, top, shape, INK))
            self._body.append(_text(left + 38.0, top + 4.0, words, halo=True))

    def svg(self, described: str) -> str:
        """Return the drawing; `described` says in words what it shows."""
        head = (
            f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {self._width:g} {self._height:g}" role="img" '
            f'font-family="{FONT}" font-size="11" fill="{INK}">'
        )
        texts = f"<title>{escape(self._title)}</title><desc>{escape(described)}</desc>"
        return "\n".join([head, texts, *self._ground(), *self._body, *self._frame(), "</svg>"])

    def _at(self, x: float, y: float) -> tuple[float, float]:
        wide, high = self._width - _LEFT - _RIGHT, self._height - _TOP - _BOTTOM
        return _LEFT + wide * self._x.share(x), self._height - _BOTTOM - high * self._y.share(y)

    def _path(self, points: Points) -> str:
        return " ".join(f"{left:.1f},{top:.1f}" for left, top in (self._at(x, y) for x, y in points))

    def _ground(self) -> list[str]:
        ground = [f'<rect width="{self._width:g}" height="{self._height:g}" fill="{PAPER}"/>']
        ends = [(self._at(tick, self._y.low), self._at(tick, self._y.high)) for tick in self._x.ticks]
        ends += [(self._at(self._x.low, tick), self._at(self._x.high, tick)) for tick in self._y.ticks]
        return [*ground, *(_segment(one, other, GRID, 0.8) for one, other in ends)]

    def _frame(self) -> list[str]:
        left, bottom = self._at(self._x.low, self._y.low)
        right, top = self._at(self._x.high, self._y.high)
        box = f'x="{left:.1f}" y="{top:.1f}" width="{right - left:.1f}" height="{bottom - top:.1f}"'
        frame = [f'<rect {box} fill="none" stroke="{INK}" stroke-width="1"/>']
        frame += [
            _text(self._at(tick, self._y.low)[0], bottom + 14.0, self._x.text(tick), anchor="middle")
            for tick in self._x.ticks
        ]
        frame += [
            _text(left - 6.0, self._at(self._x.low, tick)[1] + 4.0, self._y.text(tick), anchor="end")
            for tick in self._y.ticks
        ]
        frame.append(_text((left + right) / 2.0, self._height - 8.0, self._x.label, anchor="middle"))
        middle = (top + bottom) / 2.0
        turned = f'transform="rotate(-90 13 {middle:.1f})"'
        frame.append(f'<text x="13" y="{middle:.1f}" text-anchor="middle" {turned}>{escape(self._y.label)}</text>')
        return frame


def decades(low: float, high: float) -> tuple[float, ...]:
    """Return the powers of ten from low to high, with 2 and 5 between where there are few."""
    first, last = math.floor(math.log10(low)), math.ceil(math.log10(high))
    steps = (1.0,) if last - first > 3 else (1.0, 2.0, 5.0)
    values = (step * 10.0**power for power in range(first, last + 1) for step in steps)
    return tuple(value for value in values if low * (1 - 1e-9) <= value <= high * (1 + 1e-9))


def _segment(one: tuple[float, float], other: tuple[float, float], colour: str, weight: float, dash: str = "") -> str:
    ends = f'x1="{one[0]:.1f}" y1="{one[1]:.1f}" x2="{other[0]:.1f}" y2="{other[1]:.1f}"'
    dashes = f' stroke-dasharray="{dash}"' if dash else ""
    return f'<line {ends} stroke="{colour}" stroke-width="{weight:g}"{dashes}/>'


def _mark(left: float, top: float, shape: str, colour: str) -> str:
    if shape == "square":
        side = 2 * _MARK - 1
        corner = f'x="{left - side / 2:.1f}" y="{top - side / 2:.1f}" width="{side:g}" height="{side:g}"'
        return f'<rect {corner} fill="{PAPER}" stroke="{colour}" stroke-width="1.4"/>'
    if shape == "cross":
        return _segment((left - 3, top - 3), (left + 3, top + 3), colour, 1.4) + _segment(
            (left - 3, top + 3), (left + 3, top - 3), colour, 1.4
        )
    if shape == "none":
        return ""
    fill = colour if shape == "disc" else PAPER
    return f'<circle cx="{left:.1f}" cy="{top:.1f}" r="{_MARK}" fill="{fill}" stroke="{colour}" stroke-width="1.4"/>'


def _text(  # noqa: PLR0913 - a text is set in this many ways
    left: float, top: float, text: str, *, anchor: str = "start", size: float = 11.0, halo: bool = False
) -> str:
    around = f' stroke="{PAPER}" stroke-width="3" paint-order="stroke"' if halo else ""
    return (
        f'<text x="{left:.1f}" y="{top:.1f}" text-anchor="{anchor}" font-size="{size:g}"{around}>{escape(text)}</text>'
    )
