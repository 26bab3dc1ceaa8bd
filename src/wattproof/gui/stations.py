"""What each station of the chain shows: five labels, figures and second lines from the newest reading. Pure."""

from collections.abc import Sequence
from enum import StrEnum

import attrs

from wattproof.bench.protocol import Control
from wattproof.core.calibration import Calibration
from wattproof.core.reading import Reading, State
from wattproof.core.rig import Rig, Wiring
from wattproof.core.units import db
from wattproof.gui import figures, text
from wattproof.gui.driven import Driven
from wattproof.gui.trail import OPEN_OHM
from wattproof.procedures.requests import Wishes

_COARSE_RANGE = 10.0  # a control that spans this much is set to tenths


class Place(StrEnum):
    """The five stations, in the order of the signal."""

    TONE = "tone"
    AMPLIFIER = "amplifier"
    LOAD = "load"
    ATTENUATOR = "attenuator"
    CAPTURE = "capture"


@attrs.frozen
class Station:
    """One station: its label, its figure, a second line, and how it is marked."""

    label: str
    figure: str
    below: str = ""
    active: bool = False
    hatched: bool = False
    warned: bool = False
    filled: float | None = None  # the capture's level meter, 0…1


@attrs.frozen
class Table:
    """What is on the table right now."""

    wishes: Wishes
    rig: Rig
    calibration: Calibration
    controls: Sequence[Control]
    reading: Reading | None
    plays: bool = True  # a recording has no output

    @classmethod
    def of(cls, runner: Driven, reading: Reading | None) -> "Table":
        """Return the table of a runner as it stands."""
        bench = runner.bench
        plays = bench.identity.outputs > 0
        return cls(runner.wishes, runner.rig, runner.calibration, bench.controls, reading, plays)

    @property
    def wiring(self) -> Wiring:
        """The wiring of the channel that is looked at."""
        channel = self.wishes.channel
        return next((w for w in self.rig.wirings if w.input == channel), self.rig.wirings[0])

    @property
    def drive_vrms(self) -> float | None:
        """The drive in V rms, None where the output's scale is not known."""
        scale = self.calibration.output_vrms(self.wiring.output)
        return None if scale is None else self.wishes.level_fs * scale.value


def is_load(control: Control) -> bool:
    """Return whether one of the bench's controls belongs to the load's station."""
    return "load" in control.name.lower()


def knob_of(controls: Sequence[Control]) -> Control | None:
    """Return the amplifier's knob among the bench's controls: by name, else the first that turns."""
    turning = [c for c in controls if not c.choices and not is_load(c)]
    named = [c for c in turning if any(word in c.name.lower() for word in ("knob", "volume", "gain"))]
    return next(iter(named + turning), None)


def setting(control: Control) -> str:
    """Return a control's setting in words."""
    if is_load(control) and control.value >= OPEN_OHM:
        return text.OPEN_LOAD
    value = f"{control.value:g}" if control.choices else figures.number(control.value, decimals_of(control))
    return f"{value} {control.unit}".strip()


def decimals_of(control: Control) -> int:
    """Return to how many decimals a continuous control is set and shown."""
    return 1 if control.maximum - control.minimum >= _COARSE_RANGE else 2


def stations_of(table: Table) -> dict[Place, Station]:
    """Return what all five stations show."""
    return {
        Place.TONE: _tone(table),
        Place.AMPLIFIER: _amplifier(table),
        Place.LOAD: _load(table),
        Place.ATTENUATOR: _attenuator(table),
        Place.CAPTURE: _capture(table),
    }


def drive_words(table: Table) -> str:
    """Return the drive in volts where they are known, else in dBFS."""
    if table.drive_vrms is None:
        return figures.decibels(table.wishes.level_fs, "dBFS")
    return str(figures.prefixed(table.drive_vrms, 0.0, "V"))


def _tone(table: Table) -> Station:
    label = text.output_of(table.wiring.output)
    if not table.plays:
        return Station(text.TONE_OUT, text.RECORDED, text.RECORDED_DETAIL, active=True)
    limit = text.limit(f"{table.rig.limits.drive_vrms:.3g} V")
    if not table.wishes.tone_on:
        hertz = figures.frequency(table.wishes.frequency_hz)
        return Station(label, text.SILENT, f"{drive_words(table)} · {hertz}" if table.wishes.level_fs else hertz)
    below = f"{figures.frequency(table.wishes.frequency_hz)} · {limit}"
    return Station(label, drive_words(table), below, active=True)


def _amplifier(table: Table) -> Station:
    knob = knob_of(table.controls)
    turned = text.control(knob.label, setting(knob)) if knob else ""
    reading = table.reading
    if reading is not None and reading.state is State.OVERLOAD:
        return Station(text.AMPLIFIER, figures.DASH, text.OUTPUT_UNKNOWN)
    if reading is None or reading.state is not State.OK or reading.level_vrms is None:
        return Station(text.AMPLIFIER, figures.DASH, turned)
    parts = [turned] if turned else []
    drive = table.drive_vrms
    if drive and table.wishes.tone_on:
        ratio = reading.level_vrms.value / drive
        parts.insert(0, text.gain(ratio, figures.decibels(ratio)))
    return Station(text.AMPLIFIER, str(figures.quantity(reading.level_vrms, "V")), " · ".join(parts))


def _load(table: Table) -> Station:
    switch = next((c for c in table.controls if is_load(c)), None)
    load = table.wiring.load
    ohm = setting(switch) if switch else f"{load.ohm:.3g} Ω"
    reading = table.reading
    if not table.plays:
        return Station(text.LOAD, figures.DASH)
    if ohm == text.OPEN_LOAD:
        return Station(text.LOAD, ohm, text.NO_LOAD)
    if reading is None or reading.state is not State.OK or reading.power_w is None:
        return Station(text.LOAD, ohm)
    power = str(figures.quantity(reading.power_w, "W"))
    if load.rated_w is None:
        return Station(text.LOAD, ohm, power)
    rating = f"{load.rated_w:.3g} W"
    if reading.power_w.value > load.rated_w:
        return Station(text.LOAD, ohm, text.above_rating(rating), warned=True)
    return Station(text.LOAD, ohm, text.of_rating(power, rating))


def _attenuator(table: Table) -> Station:
    wiring = table.wiring
    if not table.plays:
        return Station(text.ATTENUATOR, figures.DASH)
    below = text.BRIDGE_TIED if wiring.bridge_tied else text.SINGLE_ENDED
    return Station(text.ATTENUATOR, f"÷ {wiring.attenuator.ratio:.4g}", below)


def _capture(table: Table) -> Station:
    label = text.input_of(table.wishes.channel)
    reading = table.reading
    if reading is None:
        return Station(label, text.NOTHING_CAPTURED)
    if reading.state is State.OVERLOAD:
        return Station(label, text.OVERLOADED, hatched=True, filled=1.0)
    peak = reading.peak_fs
    if peak is None or not peak > 0:
        return Station(label, text.UNKNOWN)
    room = text.room(f"{figures.number(max(0.0, -db(peak)), 1)} dB")
    return Station(label, text.of_full_scale(100 * peak), room, filled=min(1.0, peak))
