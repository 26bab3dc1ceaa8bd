"""A planned attenuator as a page for people: what can hurt first, then the circuit, the parts and what follows."""

import textwrap
from collections.abc import Iterator, Sequence

from wattproof.core.quantity import Quantity
from wattproof.core.rounding import rounded
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_bridge import common_mode, rejection
from wattproof.dsp.attenuator_faults import Fault, faults
from wattproof.dsp.attenuator_noise import CLAMP_FREQUENCIES_HZ, bandwidth_hz, clamp_distortion, loss, noise
from wattproof.dsp.intervals import Shape, budget, interval95
from wattproof.report.attenuator_circuit import circuit_text
from wattproof.report.attenuator_document import ONE_PERCENT, topology
from wattproof.report.attenuator_words import Caution, assumptions, verdict, warnings
from wattproof.report.characters import in_ascii
from wattproof.report.engineering import decibels_text, engineering, resistance

_NAME = 28  # columns of what a line is about
_MOST_BUDGET = 4  # sources worth a line
_LEAST_SHARE = 0.01  # of the variance, likewise
Row = tuple[str, str]


def attenuator_table(plan: Plan, *, width: int = 80, ascii_only: bool = False) -> str:
    """Return the page, lines of at most `width` columns where words can be broken, ending with a line end."""
    wish = plan.wish
    load = engineering(wish.load_ohm, "Ω")
    head = f"Attenuator, {topology(plan)}: {engineering(wish.power_w, 'W')} into {load}"
    blocks = [
        [head],
        ["Read this first", *_sentences(warnings(plan), width)],
        ["Circuit", circuit_text(plan)],
        ["Parts", *_parts(plan)],
        ["Ratio and level", *_rows(_ratio(plan), width)],
        ["Input, cable and noise", *_rows(_input(plan), width)],
        *([["Bridge", *_rows(_bridge(plan), width)]] if wish.bridge_tied else []),
        ["Any single part open or short, a terminal at its rail", *_faults(plan, width)],
        ["What this rests on", *_sentences(assumptions(plan), width)],
    ]
    text = "\n\n".join("\n".join(block) for block in blocks) + "\n"
    return in_ascii(text) if ascii_only else text


def _sentences(cautions: Sequence[Caution], width: int) -> Iterator[str]:
    for caution in cautions:
        basis = f" [{caution.basis}]" if caution.basis else ""
        yield textwrap.fill(caution.text + basis, width, initial_indent="  * ", subsequent_indent="    ")


def _rows(rows: Iterator[Row], width: int) -> Iterator[str]:
    for name, text in rows:
        yield textwrap.fill(text, width, initial_indent=f"  {name:<{_NAME}}", subsequent_indent=" " * (_NAME + 2))


def _parts(plan: Plan) -> Iterator[str]:
    yield "  part    value      at full power      after a fault     rating, at least"
    for part in plan.parts:
        running = f"{engineering(part.running_w, 'W')}, {engineering(part.running_v, 'V')}"
        fault = f"{engineering(part.fault_w, 'W')}, {engineering(part.fault_v, 'V')}"
        rating = f"{part.rated_w:g} W, {part.rated_v:g} V"
        yield f"  {part.name:<7} {resistance(part.ohm):<10} {running:<18} {fault:<18}{rating}"
    twice = "; twice, once for each terminal" if plan.wish.bridge_tied else ""
    yield f"  {100.0 * plan.wish.part_tolerance:g} % parts of {plan.wish.series.value}{twice}. V are with the rail on."


def _ratio(plan: Plan) -> Iterator[Row]:
    ratio, wish = plan.ratio(), plan.wish
    interval = interval95(ratio, {part.source: Shape.RECTANGULAR for part in ratio.parts})
    value, spread = rounded(ratio)
    relative = ratio.u / ratio.value
    yield "Ratio", f"{value} (± {spread} at 95 % as normal; {decibels_text(db(ratio.value), 3)})"
    shaped = f"{interval.low:.5g} to {interval.high:.5g}"
    yield "  95 %, tolerances as such", shaped
    least, greatest = plan.extremes()
    yield "  worst case", f"{least:.5g} to {greatest:.5g}"
    yield (
        "  standard uncertainty",
        f"{_percent(relative)}, {DB_PER_RELATIVE * relative:.4f} dB; of power {_percent(2 * relative)}",
    )
    yield "  of which", ", ".join(_budget(ratio))
    yield "Full power", f"{engineering(wish.full_vrms, 'V', 4)} rms at the output"
    each = "at each input" if wish.two_inputs else "at the input"
    yield f"  {each}", f"{engineering(plan.level_vrms, 'V', 4)} rms"
    full = f"{engineering(wish.full_scale_vrms, 'V', 4)} rms"
    least_db = db(wish.full_scale_vrms / (wish.seen_vrms / least))
    yield (
        "  headroom",
        f"{decibels_text(db(plan.headroom))} to full scale of {full}; {decibels_text(least_db)} at worst",
    )
    yield "Amplifier sees", f"{engineering(plan.with_attenuator_ohm, 'Ω', 4)} with the attenuator connected"


def _budget(ratio: Quantity) -> list[str]:
    rows = budget(ratio)
    named = [f"{row.source} {100.0 * row.share:.0f} %" for row in rows[:_MOST_BUDGET] if row.share >= _LEAST_SHARE]
    rest = sum(row.share for row in rows[len(named) :])
    return [*named, f"others {100.0 * rest:.1g} %"] if rest > 0.0 else named


def _input(plan: Plan) -> Iterator[Row]:
    each = " for each pin" if plan.wish.bridge_tied else ""
    yield "Source impedance", f"{engineering(plan.leg.source_ohm, 'Ω')}{each}"
    loss_db = decibels_text(db(loss(plan, 20_000.0)), 4)
    with_cable = f"with {plan.wish.cable_pf:g} pF of cable"
    yield "Bandwidth, −3 dB", f"{engineering(bandwidth_hz(plan), 'Hz')} {with_cable}; {loss_db} lost at 20 kHz"
    told = noise(plan)
    own = "assumed" if told.interface_is_assumed else "stated"
    thermal, interface = engineering(told.thermal_vrms, "V"), engineering(told.interface_vrms, "V")
    yield "Thermal noise", f"{thermal} rms, 20 Hz to 20 kHz; the interface's own is {interface} ({own})"
    yield "  raises the floor by", decibels_text(db(told.rise), 3)
    if plan.wish.clamp_pf is None:
        yield "Clamp", "none; with --clamp-pf its capacitance and distortion are counted"
        return
    for hz in CLAMP_FREQUENCIES_HZ:
        ratio = clamp_distortion(plan, hz)
        if ratio is not None:
            figures = f"{_percent(ratio)} ({decibels_text(db(ratio))})"
            yield f"Clamp at {hz / 1e3:g} kHz", f"{figures} of its own at full power, from {plan.wish.clamp_pf:g} pF"


def _bridge(plan: Plan) -> Iterator[Row]:
    shared, kept, coarse = common_mode(plan), rejection(plan), rejection(plan, ONE_PERCENT)
    yield "Each pin against ground", f"limit {engineering(shared.limit_v, 'V')} peak"
    yield "  running", f"{engineering(shared.running_v, 'V')} DC, {engineering(shared.swing_v, 'V')} peak about it"
    yield "  at switch-on", f"a step of {engineering(shared.switch_on_v, 'V')} on both"
    yield "  one half at a rail", f"{engineering(shared.stuck_v, 'V')}, and as much between the pins"
    yield "Rejection", f"{decibels_text(db(kept.worst))} worst case, {decibels_text(db(kept.standard))} standard"
    yield (
        "  of 1 % parts",
        f"{decibels_text(db(coarse.worst))} worst case, {decibels_text(db(coarse.standard))} standard",
    )
    worst, standard = engineering(kept.hum_worst_vrms, "V"), engineering(kept.hum_standard_vrms, "V")
    yield "Hum floor", f"{worst} rms worst case, {standard} standard, at the output"
    if kept.hum_worst:
        levels = f"{decibels_text(db(kept.hum_worst))} worst case, {decibels_text(db(kept.hum_standard))} standard"
        yield "  to full power", levels
    yield "Interface", "its own rejection comes on top; both taps on one point measure what there really is"


def _faults(plan: Plan, width: int) -> Iterator[str]:
    yield "  part  fails  full power  pin, peak  into input  if shorted  in 1 s    heat  volts"
    for fault in faults(plan):
        yield _fault_line(fault)
    limit = f"{engineering(plan.wish.pin_limit_v, 'V')} peak and {plan.wish.input_limit_ma:g} mA"
    text = (
        f"Limits of a pin: {limit}. 'if shorted' is what its own protection may have to carry, 'in 1 s' the most "
        "energy that any input can draw, 'heat' and 'volts' the worst part's share of its rating."
    )
    yield textwrap.fill(text, width, initial_indent="  ", subsequent_indent="  ")
    yield textwrap.fill(verdict(plan).text, width, initial_indent="  ", subsequent_indent="  ")


def _fault_line(fault: Fault) -> str:
    figures = (
        f"{engineering(fault.level_vrms, 'V'):<11}",
        f"{engineering(fault.pin_v, 'V'):<10}",
        f"{engineering(fault.input_ma / 1e3, 'A'):<11}",
        f"{engineering(fault.shorted_ma / 1e3, 'A'):<11}",
        f"{engineering(fault.most_energy_j, 'J'):<9}",
        f"{100.0 * fault.heat_share:>3.0f} %",
        f"{100.0 * fault.voltage_share:>4.0f} %",
    )
    mark = "" if fault.harmless else "  ABOVE ITS LIMIT"
    return f"  {fault.part:<5} {fault.kind.value:<6} {' '.join(figures)}{mark}"


def _percent(ratio: float) -> str:
    return f"{100.0 * ratio:.3g} %"
