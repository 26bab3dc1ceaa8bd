"""How a rig is wired, as a drawing: interface, amplifier, load, attenuator and back, one lane for each channel."""

from html import escape

from wattproof.core.rig import Rig, Wiring
from wattproof.report.plot_svg import FONT, INK, PAPER

_WIDTH, _LANE, _TOP = 640.0, 158.0, 26.0
_BOX = 42.0


def wiring_svg(rig: Rig) -> str:
    """Return the drawing, with a description for those who cannot see it."""
    height = _TOP + _LANE * len(rig.wirings)
    lanes = [part for number, wiring in enumerate(rig.wirings) for part in _lane(wiring, _TOP + _LANE * number)]
    described = "; ".join(_words(wiring) for wiring in rig.wirings)
    size = f'viewBox="0 0 {_WIDTH:g} {height:g}" font-family="{FONT}" font-size="11" fill="{INK}"'
    return "\n".join([
        f'<svg xmlns="http://www.w3.org/2000/svg" role="img" {size}>',
        f"<title>Wiring of {escape(rig.name)}</title><desc>{escape(described)}</desc>",
        f'<rect width="{_WIDTH:g}" height="{height:g}" fill="{PAPER}"/>',
        *lanes,
        "</svg>",
    ])  # fmt: skip


def _lane(wiring: Wiring, top: float) -> list[str]:
    middle = top + 34.0
    load_foot = middle + 78.0
    return [
        _text(8, top - 8, f"{wiring.name} channel", weight="600"),
        *_box(8, middle, 92, "output", str(wiring.output)),
        _arrow(100, middle, 178),
        _text(139, middle - 8, wiring.drive_path or "line", anchor="middle"),
        *_box(178, middle, 104, "amplifier", "under test"),
        _wire(282, middle, 352, middle),
        _dot(352, middle),
        _wire(352, middle, 352, middle + 22),
        _resistor(352, middle + 22),
        _wire(352, middle + 62, 352, load_foot),
        _text(366, middle + 38, f"load {wiring.load.ohm:.5g} Ω"),
        _text(366, middle + 52, _load_words(wiring)),
        *_earth(352, load_foot, bridge_tied=wiring.bridge_tied),
        _arrow(352, middle, 412),
        *_box(412, middle, 104, "attenuator", f"÷ {wiring.attenuator.ratio:.5g}"),
        _arrow(516, middle, 540),
        *_box(540, middle, 92, "input", str(wiring.input)),
    ]


def _load_words(wiring: Wiring) -> str:
    load = wiring.load
    return "measured four-wire" if load.measured_ohm is not None else "nominal, not measured"


def _words(wiring: Wiring) -> str:
    return (
        f"{wiring.name}: output {wiring.output} drives the amplifier, its output feeds {wiring.load.ohm:g} ohm and, "
        f"divided by {wiring.attenuator.ratio:g}, input {wiring.input}"
    )


def _box(left: float, middle: float, width: float, name: str, value: str) -> list[str]:
    shape = f'x="{left:g}" y="{middle - _BOX / 2:g}" width="{width:g}" height="{_BOX:g}" rx="3"'
    return [
        f'<rect {shape} fill="{PAPER}" stroke="{INK}" stroke-width="1.4"/>',
        _text(left + width / 2, middle - 3, name, anchor="middle"),
        _text(left + width / 2, middle + 12, value, anchor="middle", weight="600"),
    ]


def _wire(x1: float, y1: float, x2: float, y2: float) -> str:
    return f'<line x1="{x1:g}" y1="{y1:g}" x2="{x2:g}" y2="{y2:g}" stroke="{INK}" stroke-width="1.4"/>'


def _arrow(x1: float, y: float, x2: float) -> str:
    head = f'<path d="M{x2:g} {y:g} l-8 -4 v8 z" fill="{INK}"/>'
    return _wire(x1, y, x2 - 6, y) + head


def _resistor(x: float, y: float) -> str:
    return f'<rect x="{x - 7:g}" y="{y:g}" width="14" height="40" fill="{PAPER}" stroke="{INK}" stroke-width="1.4"/>'


def _dot(x: float, y: float) -> str:
    return f'<circle cx="{x:g}" cy="{y:g}" r="3"/>'


def _earth(x: float, y: float, *, bridge_tied: bool) -> list[str]:
    if bridge_tied:
        return [_dot(x, y), _text(x + 10, y + 3, "other output terminal, which is not ground")]
    return [_wire(x - half, y + 4 * n, x + half, y + 4 * n) for n, half in enumerate((10, 6, 2))]


def _text(x: float, y: float, text: str, anchor: str = "start", weight: str = "400") -> str:
    return f'<text x="{x:g}" y="{y:g}" text-anchor="{anchor}" font-weight="{weight}">{escape(text)}</text>'
