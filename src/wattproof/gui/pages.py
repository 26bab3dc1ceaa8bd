"""Fills each station's page: what can be set there, what is known of it, and its cautions."""

import attrs

from wattproof.core.units import db
from wattproof.gui import figures, text
from wattproof.gui.controls import FlatButton, Switch
from wattproof.gui.driven import Driven
from wattproof.gui.panel import Hands, Panel
from wattproof.gui.stations import Place, Table, is_load, knob_of
from wattproof.gui.tone_page import TonePage, build_tone_page

_MOST_CHANNELS = 8  # what a row of buttons can hold


@attrs.define(eq=False)
class Pages:
    """The settings of all stations, and how they are brought up to date. Without an output there is no tone page."""

    panel: Panel
    runner: Driven
    tone: TonePage | None
    channel: Switch | None

    def refresh(self, table: Table) -> None:
        """Show what is in force."""
        if self.tone is not None:
            self.tone.refresh(self.runner, table)
        if self.channel is not None:
            self.channel.show_value(table.wishes.channel)
        self.panel.show_controls(table.controls)
        _state_facts(self.panel, self.runner, table)


def build_pages(panel: Panel, runner: Driven, hands: Hands, table: Table) -> Pages:
    """Build every page from what the bench and the rig declare."""
    tone = None
    if table.plays:
        tone = build_tone_page(panel.pages[Place.TONE], runner.bench.identity.rate_hz, hands, table)
    else:
        panel.pages[Place.TONE].add_words(text.RECORDED_PAGE)
        panel.pages[Place.TONE].rows.addStretch(1)
    _amplifier_page(panel, hands, table)
    _load_page(panel, hands, table)
    panel.pages[Place.ATTENUATOR].add_fact(text.DIVIDES)
    panel.pages[Place.ATTENUATOR].add_fact(text.PICK_OFF)
    panel.pages[Place.ATTENUATOR].add_cautions(text.CAUTION_ATTENUATOR)
    pages = Pages(panel, runner, tone, _capture_page(panel, runner, hands, table))
    pages.refresh(table)
    return pages


def _amplifier_page(panel: Panel, hands: Hands, table: Table) -> None:
    page = panel.pages[Place.AMPLIFIER]
    knob = knob_of(table.controls)
    if table.plays:
        page.add_words(text.TURN_SIMULATED if knob else text.TURN_REAL)
    for control in sorted(table.controls, key=lambda found: knob is None or found.name != knob.name):
        if not is_load(control):
            panel.add_control(control, hands.turn)
    stroke = FlatButton(panel.theme, text.NEW_STROKE)
    stroke.clicked.connect(lambda _=False: hands.new_stroke())
    page.rows.addWidget(stroke)
    page.add_cautions(text.CAUTION_MAINS, text.CAUTION_BRIDGE)


def _load_page(panel: Panel, hands: Hands, table: Table) -> None:
    page = panel.pages[Place.LOAD]
    switches = [control for control in table.controls if is_load(control)]
    for control in switches:
        panel.add_control(control, hands.turn)
    facts = (text.LOAD_MEASURED, text.LOAD_RATING)
    for fact in facts if switches else (text.LOAD_NOMINAL, *facts):
        page.add_fact(fact)
    page.add_cautions(text.CAUTION_HOT)


def _capture_page(panel: Panel, runner: Driven, hands: Hands, table: Table) -> Switch | None:
    page = panel.pages[Place.CAPTURE]
    channel = None
    inputs = min(runner.bench.identity.inputs, _MOST_CHANNELS)
    if inputs > 1:
        names = {wiring.input: wiring.name for wiring in table.rig.wirings} if table.plays else {}
        choices = [(float(number), names.get(number, str(number))) for number in range(1, inputs + 1)]
        channel = Switch(panel.theme, text.CHANNEL, choices)
        channel.adjusted.connect(lambda value: hands.wish_channel(round(value)))
        page.rows.addWidget(channel)
    for fact in (text.INPUT_SCALE, text.ROOM, text.RATE):
        page.add_fact(fact)
    page.add_words(text.CAPTURE_ADVICE)
    page.rows.addStretch(1)
    return channel


def _state_facts(panel: Panel, runner: Driven, table: Table) -> None:
    wiring, load = table.wiring, table.wiring.load
    page = panel.pages[Place.ATTENUATOR]
    known = table.plays
    page.set_fact(text.DIVIDES, f"{wiring.attenuator.ratio:.4g}" if known else text.UNKNOWN)
    pick_off = text.BRIDGE_TIED if wiring.bridge_tied else text.SINGLE_ENDED
    page.set_fact(text.PICK_OFF, pick_off if known else text.UNKNOWN)
    page = panel.pages[Place.LOAD]
    page.set_fact(text.LOAD_NOMINAL, f"{load.nominal_ohm:.4g} Ω" if known else text.UNKNOWN)
    page.set_fact(text.LOAD_MEASURED, f"{load.measured_ohm:.4g} Ω" if load.measured_ohm else text.UNKNOWN)
    page.set_fact(text.LOAD_RATING, f"{load.rated_w:.3g} W" if load.rated_w else text.UNKNOWN)
    page = panel.pages[Place.CAPTURE]
    scale = table.calibration.input_vrms(table.wishes.channel)
    page.set_fact(text.INPUT_SCALE, str(figures.quantity(scale, "V rms")) if scale else text.UNKNOWN)
    page.set_fact(text.RATE, f"{runner.bench.identity.rate_hz / 1000:g} kHz")
    peak = table.reading.peak_fs if table.reading is not None else None
    page.set_fact(text.ROOM, f"{figures.number(max(0.0, -db(peak)), 1)} dB" if peak else figures.DASH)
