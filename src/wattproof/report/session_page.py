"""From a session to its report: statement first, then conditions, wiring, curves, calibration, evidence."""

from collections.abc import Iterator

import attrs

from wattproof.core.reading import Reference
from wattproof.core.rounding import stated
from wattproof.core.run import Ending
from wattproof.core.units import db
from wattproof.core.wording import sentence
from wattproof.procedures.presets import Tick
from wattproof.report.page import Block, Code, Drawing, Drawings, Facts, Grid, Items, Page, Paragraph, Section
from wattproof.report.power_figures import curve_svg, residual_svg, spectrum_svg
from wattproof.report.power_words import ONSET_DEFINITION, figure, paragraph
from wattproof.report.session_content import PointPicture, RunContent, SessionContent
from wattproof.report.wiring_svg import wiring_svg

_RIGHT = ("Voltage", "Power", "THD+N")
_NOT_STATED = "not stated"
_MARKS = {Tick.DONE: "done", Tick.NOT_DONE: "not done", Tick.NOT_SEEN: "not seen by the program"}


def session_page(content: SessionContent) -> Page:
    """Return the report of a session, every run that states power in it."""
    device = content.device
    runs = [run for run in content.runs if run.statement.rows]
    head = (
        ("Amplifier", device.name or _NOT_STATED),
        ("Serial number", device.serial or _NOT_STATED),
        ("Maker's claim", device.claim or _NOT_STATED),
        ("State", device.state or _NOT_STATED),
        ("Tested by", device.tested_by or _NOT_STATED),
        ("Tested", ", ".join(dict.fromkeys(_day(run.at) for run in runs)) or _NOT_STATED),
        ("Session", content.file),
        ("Hash", f"{content.head[:16]} …, whole under Evidence"),
    )
    sections = [section for run in runs for section in _run_sections(run, many=len(runs) > 1)]
    if not runs:
        sections = [Section("Power statement", (Paragraph("The session holds no run that states power."),))]
    if content.notes:
        sections.append(Section("Notes", (Items(content.notes),)))
    sections.append(_evidence(content))
    foot = f"{device.name or content.file} · {content.head[:16]}"
    return Page("Power statement", device.name or content.file, head, tuple(sections), foot, content.photo or b"")


def _run_sections(run: RunContent, *, many: bool) -> Iterator[Section]:
    named = f"Run {run.number}: " if many else ""
    yield Section(f"{named}What it delivers", tuple(_statement(run)))
    yield Section("Conditions and definitions", tuple(_conditions(run)))
    yield Section("Wiring", (Drawings((Drawing(wiring_svg(run.rig), _wiring_caption(run)),)),))
    curve = curve_svg(run.statement)
    if curve:
        caption = (
            "THD+N against output power. The grey band is the 95 % uncertainty of THD+N; marks are the stated points, "
            "their bars the 95 % uncertainty of the power. Where the curve falls as power rises, noise makes it up."
        )
        yield Section("Distortion against power", (Drawings((Drawing(curve, caption),)),))
    if run.pictures:
        yield Section("What is left at each point", tuple(_pictures(run)))
    yield Section("Calibration", tuple(_calibration(run)))
    yield Section("Findings and deviations", (Items(tuple(_deviations(run)) or ("None was seen.",)),))


def _statement(run: RunContent) -> Iterator[Block]:
    statement = run.statement
    for row in statement.rows:
        yield Paragraph(paragraph(attrs.evolve(statement, rows=(row,))), lead=True)
    rows = []
    for stated_row in statement.rows:
        for point in stated_row.points:
            held = "–" if point.power_w is None else "momentary" if point.held_s == 0.0 else f"{point.held_s:g} s"
            rows.append((
                f"{stated_row.row.wiring.name} ({stated_row.row.channel})",
                f"{stated_row.row.load.ohm:.4g} Ω",
                ", ".join(str(channel) for channel in stated_row.row.driven),
                point.at,
                figure(point.voltage_vrms, "V"),
                figure(point.power_w, "W"),
                "–" if point.thdn is None else f"{100.0 * point.thdn.value:.3g} %",
                held,
            ))  # fmt: skip
    columns = ("Channel", "Load", "Driven", "Point", "Voltage", "Power", "THD+N", "Held")
    yield Grid(columns, tuple(rows), _RIGHT)
    yield Paragraph("V is rms. ± is the 95 % uncertainty.")
    ratios = [
        f"Channel {each.channel}, {each.at}: {figure(each.ratio, 'times')} the power into {each.over_ohm:g} Ω as into "
        f"{each.under_ohm:g} Ω"
        for each in statement.ratios
    ]
    if ratios:
        yield Items(tuple(ratios))
    said = [
        sentence(note)
        for row in statement.rows
        for note in row.notes
        if note.kind.name.startswith(("CLAIM", "FLATTERS"))
    ]
    if said:
        yield Items(tuple(_capital(words) for words in dict.fromkeys(said)))


def _conditions(run: RunContent) -> Iterator[Block]:
    plan = run.statement.plan
    to = "the total signal" if plan.reference is Reference.TOTAL else "the fundamental"
    supply = _NOT_STATED if plan.supply_v is None else f"{plan.supply_v:g} V"
    how = "power by steps of the drive" if run.procedure == "power" else "power by hand on the volume control"
    yield Facts((
        ("Procedure", how),
        ("Test tone", f"{plan.frequency_hz:g} Hz sine"),
        ("Measuring band", f"{plan.low_hz:g} Hz to {plan.high_hz:g} Hz"),
        ("THD+N is to", to),
        ("Supply", supply),
        ("Held", f"{plan.hold_s:g} s at each point" if plan.hold_s else "not held: momentary values"),
        ("Interface", f"{run.bench}, {run.rate_hz / 1e3:g} kHz{'' if run.real else '; simulated, no real amplifier'}"),
        ("Begun", f"{run.at[:16].replace('T', ' ')} UTC"),
    ))  # fmt: skip
    yield Paragraph(_raised(ONSET_DEFINITION))
    yield Paragraph(
        "THD+N is what is left of the signal when its fundamental is taken away by a least-squares fit: harmonics, "
        "hum and noise in the band, as rms. Power is the square of the rms voltage over the load's resistance."
    )
    conditions = run.statement.conditions
    if conditions:
        words = tuple(f"{each.rule}: {each.asks}" + (f" ({each.remark})" if each.remark else "") for each in conditions)
        yield Items(words, tuple(_MARKS[each.tick] for each in conditions))


def _wiring_caption(run: RunContent) -> str:
    limit = run.rig.limits.drive_vrms
    return f"Rig {run.rig.name}. The drive was limited to {limit:.4g} V rms. {run.rig.note}".strip()


def _pictures(run: RunContent) -> Iterator[Block]:
    for row in sorted({each.row for each in run.pictures}):
        own = [each for each in run.pictures if each.row == row]
        stated_row = next(each for each in run.statement.rows if each.row.index == row)
        yield Paragraph(f"Channel {stated_row.row.channel} into {stated_row.row.load.ohm:.4g} Ω", heads=True)
        pairs = [
            drawing
            for each in own
            for drawing in (
                Drawing(residual_svg(each), f"{_named(each)}: waveform and residual"),
                Drawing(spectrum_svg(each), f"{_named(each)}: spectrum; {_floor_words(each)}"),
            )
        ]
        yield Drawings(tuple(pairs), across=2)


def _named(each: PointPicture) -> str:
    return f"{_capital(each.at)}, {'held' if each.held else 'nearest reading'}"


def _floor_words(each: PointPicture) -> str:
    if each.floor is None:
        return "the interface's own floor is not known"
    return "shaded: the interface's own noise" + (", taken as white" if each.floor.white else "")


def _calibration(run: RunContent) -> Iterator[Block]:
    calibration = run.calibration
    rows = [
        (f"{direction} {scale.socket}", stated(scale.full_scale_vrms), scale.origin, scale.date)
        for direction, scales in (("Input", calibration.inputs), ("Output", calibration.outputs))
        for scale in scales
    ]
    if rows:
        yield Grid(("Socket", "Full scale, V rms", "Origin", "Date"), tuple(rows))
    else:
        yield Paragraph("No calibration of the interface: volts rest on the full scale that was typed.")
    floors = [
        (f"{name} {floor.socket}", _dbfs(floor.level_fs, 0), _dbfs(floor.noise_fs.value, 1))
        for name, all_floors in (("Converter-out", calibration.out_floors), ("Converter-in", calibration.in_floors))
        for floor in all_floors
        if floor.noise_fs.value > 0.0
    ]
    if floors:
        yield Grid(("Floor", "At", "Noise"), tuple(floors))
    loops = "calibrated by loopback" if calibration.loops else "not calibrated by loopback"
    yield Paragraph(
        f"{_capital(calibration.device or 'The interface')}: {loops}"
        + (f", {calibration.date}." if calibration.date else ".")
    )


def _deviations(run: RunContent) -> Iterator[str]:
    if run.ending is None:
        yield "The program ended before the run did: the statement rests on what was kept until then."
    elif run.ending is not Ending.DONE:
        yield f"The run was {run.ending.value}: {run.why or 'by a person'}."
    left = sum(bool(each.left_out) for each in run.statement.curve)
    if left:
        yield f"{left} readings are no part of the curve (jumps and crackle of the control)."
    for row in run.statement.rows:
        for note in row.notes:
            if not note.kind.name.startswith(("CLAIM", "FLATTERS")):
                yield f"Channel {row.row.channel}, {row.row.load.ohm:.4g} Ω: {sentence(note)}."
        load = row.row.load
        if load.measured_ohm is None and load.tolerance:
            yield f"The load of {load.ohm:g} Ω was not measured: its tolerance of {100 * load.tolerance:g} % counts."
    if not run.real:
        yield "The amplifier was simulated: this is a trial of the method and says nothing of a real amplifier."


def _evidence(content: SessionContent) -> Section:
    newest = content.runs[-1].versions if content.runs else {}
    counts = ", ".join(f"run {run.number}: {run.readings} readings" for run in content.runs) or "none"
    seeds = ", ".join(f"{name} {seed}" for run in content.runs[-1:] for name, seed in run.seeds.items())
    facts = [
        ("Kept", counts),
        ("Made with", ", ".join(f"{name} {version}" for name, version in newest.items())),
        *([("Random seed", seeds)] if seeds else []),
    ]
    return Section(
        "Evidence",
        (
            Paragraph(
                "The session file holds every reading with its raw capture. Whoever has it can make each figure again; "
                "with this hash the program also tells whether anything was cut off, edited or rewritten since."
            ),
            Code(content.head),
            Code(f"wattproof recheck {content.file} --expect {content.head}"),
            Facts(tuple(facts)),
        ),
    )


def _dbfs(ratio: float, digits: int) -> str:
    return f"{db(ratio):.{digits}f} dBFS".replace("-", "\N{MINUS SIGN}") if ratio else "silence"


def _raised(text: str) -> str:
    """Return a definition with its exponents raised."""
    return text.replace("^2", "²").replace("^4", "⁴").replace("^6", "⁶")


def _day(at: str) -> str:
    return at[:10]


def _capital(words: str) -> str:
    return words[:1].upper() + words[1:]
