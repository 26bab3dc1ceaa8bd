"""The circuit of a planned attenuator as a drawing (SVG), with the symbols of IEC 60617: resistors are rectangles."""

from html import escape

from wattproof.dsp.attenuator import Plan
from wattproof.report.attenuator_document import topology
from wattproof.report.engineering import engineering, resistance

_WIDTH, _SINGLE_HEIGHT, _BRIDGE_HEIGHT = 760, 330, 500
_INK, _PAPER, _CAUTION = "#14242e", "#fbfaf6", "#9c2f12"
_TEXT = f'font-family="sans-serif" font-size="14" fill="{_INK}" stroke-linecap="round"'
_LONG, _THICK = 60, 20  # of a resistor's body; three to one, as the standard draws it
_OUT_X, _LOAD_X, _R1A_X, _R1B_X, _R2A_X, _R2B_X, _IN_X = 40, 110, 220, 350, 460, 560, 680
_TOP_Y, _LEG_HEIGHT = 80, 160
_TERMINAL = 5


def circuit_svg(plan: Plan) -> str:
    """Return the drawing as a text that stands alone, with a title and a description for those who cannot see it."""
    bridge = plan.wish.bridge_tied
    height = _BRIDGE_HEIGHT if bridge else _SINGLE_HEIGHT
    title = f"Attenuator, {topology(plan)}, {plan.leg.ratio:.4g} to 1"
    body = [*(_bridge(plan) if bridge else _single(plan)), *_caption(plan, height)]
    return "\n".join([
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_WIDTH} {height}" role="img" {_TEXT}>',
        f"<title>{escape(title)}</title>",
        f"<desc>{escape(_described(plan))}</desc>",
        f'<rect width="{_WIDTH}" height="{height}" fill="{_PAPER}"/>',
        _label(_OUT_X, 36, "AMPLIFIER"),
        _label(_IN_X, 36, "INTERFACE", anchor="end"),
        *body,
        "</svg>\n",
    ])  # fmt: skip


def _single(plan: Plan) -> list[str]:
    ground_y = _TOP_Y + _LEG_HEIGHT
    r2 = resistance(plan.leg.lower_ohm[0])
    return [
        *_upper(plan, _TOP_Y, "out", "input"),
        *_load(plan, _TOP_Y, ground_y),
        *_lower(_R2A_X, _TOP_Y, ground_y, "R2a", r2),
        *_lower(_R2B_X, _TOP_Y, ground_y, "R2b", r2),
        _line(_OUT_X, ground_y, _IN_X, ground_y),
        *_terminal(_OUT_X, ground_y, "ground", "start"),
        *_terminal(_IN_X, ground_y, "ground", "end"),
        *_earth(_R2B_X + 60, ground_y),
    ]


def _bridge(plan: Plan) -> list[str]:
    middle_y, bottom_y = _TOP_Y + _LEG_HEIGHT, _TOP_Y + 2 * _LEG_HEIGHT
    r2 = resistance(plan.leg.lower_ohm[0])
    plus, minus = ("input 1", "input 2") if plan.wish.two_inputs else ("pin +", "pin −")
    return [
        *_upper(plan, _TOP_Y, "out +", plus),
        *_upper(plan, bottom_y, "out −", minus),
        *_load(plan, _TOP_Y, bottom_y),
        *(shape for x, name in ((_R2A_X, "R2a"), (_R2B_X, "R2b")) for shape in _lower(x, _TOP_Y, middle_y, name, r2)),
        *(shape for x, name in ((_R2A_X, "R2a"), (_R2B_X, "R2b")) for shape in _lower(x, middle_y, bottom_y, name, r2)),
        _line(_R2A_X, middle_y, _IN_X, middle_y),
        *_terminal(_IN_X, middle_y, "ground", "end"),
        *_earth(_R2B_X + 60, middle_y),
        _label(_LOAD_X + 16, middle_y + 50, "neither terminal is ground", colour=_CAUTION),
    ]


def _upper(plan: Plan, y: float, out: str, into: str) -> list[str]:
    r1 = resistance(plan.leg.upper_ohm[0])
    half = _LONG / 2
    return [
        _line(_OUT_X, y, _R1A_X - half, y),
        _body(_R1A_X - half, y - _THICK / 2, _LONG, _THICK),
        _label(_R1A_X, y - 18, f"R1a  {r1}", anchor="middle"),
        _line(_R1A_X + half, y, _R1B_X - half, y),
        _body(_R1B_X - half, y - _THICK / 2, _LONG, _THICK),
        _label(_R1B_X, y - 18, f"R1b  {r1}", anchor="middle"),
        _line(_R1B_X + half, y, _IN_X, y),
        *_terminal(_OUT_X, y, out, "start"),
        *_terminal(_IN_X, y, into, "end"),
    ]


def _lower(x: float, top_y: float, bottom_y: float, name: str, value: str) -> list[str]:
    body_y = (top_y + bottom_y - _LONG) / 2
    return [
        _dot(x, top_y),
        _line(x, top_y, x, body_y),
        _body(x - _THICK / 2, body_y, _THICK, _LONG),
        _line(x, body_y + _LONG, x, bottom_y),
        _dot(x, bottom_y),
        _label(x + 16, body_y + 26, name),
        _label(x + 16, body_y + 44, value),
    ]


def _load(plan: Plan, top_y: float, bottom_y: float) -> list[str]:
    value = engineering(plan.wish.load_ohm, "Ω")
    middle = (top_y + bottom_y - _LONG) / 2
    return [
        _dot(_LOAD_X, top_y),
        _line(_LOAD_X, top_y, _LOAD_X, middle),
        _body(_LOAD_X - _THICK / 2, middle, _THICK, _LONG),
        _line(_LOAD_X, middle + _LONG, _LOAD_X, bottom_y),
        _dot(_LOAD_X, bottom_y),
        _label(_LOAD_X + 16, middle + 26, "load"),
        _label(_LOAD_X + 16, middle + 44, f"{value}, hot"),
    ]


def _earth(x: float, y: float) -> list[str]:
    """Return the symbol for ground: three bars, each shorter than the one above."""
    bars = [_line(x - half, y + 18 + 6 * n, x + half, y + 18 + 6 * n) for n, half in enumerate((15, 9, 3))]
    return [_dot(x, y), _line(x, y, x, y + 18), *bars]


def _terminal(x: float, y: float, name: str, anchor: str) -> list[str]:
    circle = f'<circle cx="{x:g}" cy="{y:g}" r="{_TERMINAL}" fill="{_PAPER}" stroke="{_INK}" stroke-width="2"/>'
    return [circle, _label(x + (8 if anchor == "end" else -8), y + 24, name, anchor=anchor)]


def _caption(plan: Plan, height: float) -> list[str]:
    rated = {part.name[:2]: f"{part.rated_w:g} W, {part.rated_v:g} V" for part in plan.parts}
    parts = f"{100 * plan.wish.part_tolerance:g} % parts, at least: R1 {rated['R1']} each; R2 {rated['R2']} each"
    return [
        _label(_OUT_X, height - 36, f"Ratio {plan.leg.ratio:.4g} with the input of {_input(plan)} connected"),
        _label(_OUT_X, height - 14, parts),
    ]


def _input(plan: Plan) -> str:
    return engineering(plan.wish.input_ohm, "Ω")


def _described(plan: Plan) -> str:
    legs = "from each output terminal to its own pin" if plan.wish.bridge_tied else "from the output to the input"
    return (
        f"Two resistors of {resistance(plan.leg.upper_ohm[0])} in series {legs}; two of "
        f"{resistance(plan.leg.lower_ohm[0])} in parallel from there to the interface's ground; "
        f"a load of {engineering(plan.wish.load_ohm, 'Ω')} across the output."
    )


def _line(x1: float, y1: float, x2: float, y2: float) -> str:
    return f'<line x1="{x1:g}" y1="{y1:g}" x2="{x2:g}" y2="{y2:g}" stroke="{_INK}" stroke-width="2"/>'


def _body(x: float, y: float, width: float, height: float) -> str:
    shape = f'x="{x:g}" y="{y:g}" width="{width:g}" height="{height:g}"'
    return f'<rect {shape} fill="{_PAPER}" stroke="{_INK}" stroke-width="2"/>'


def _dot(x: float, y: float) -> str:
    return f'<circle cx="{x:g}" cy="{y:g}" r="3.5"/>'


def _label(x: float, y: float, text: str, anchor: str = "start", colour: str = _INK) -> str:
    return f'<text x="{x:g}" y="{y:g}" text-anchor="{anchor}" fill="{colour}">{escape(text)}</text>'
