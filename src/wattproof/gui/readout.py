"""What stands in the four figures and the sentence for one reading. Pure: the window only paints it."""

from enum import StrEnum

import attrs

from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading, State
from wattproof.core.rounding import expanded
from wattproof.core.units import db
from wattproof.gui import figures, task_text, text
from wattproof.gui.sentence import Mark, Sentence, sentence_of
from wattproof.gui.trail import OPEN_OHM


class Withheld(StrEnum):
    """Whether a figure shows a number, a dash, or the hatching that stands for an overloaded capture only."""

    NO = "no"
    DASH = "dash"
    HATCH = "hatch"


@attrs.frozen
class Figure:
    """One figure: label above, number and unit, a line below."""

    label: str
    number: str
    unit: str
    below: str
    withheld: Withheld = Withheld.NO
    second: str = ""  # the same in the trade's other unit, painted larger than what is below
    about: str = ""  # beside the label
    quantity: Quantity | None = None  # whose budget opens

    @property
    def spoken(self) -> str:
        """The figure for a screen reader."""
        figure = text.WITHHELD if self.withheld is not Withheld.NO else f"{self.number} {self.unit}"
        return text.spoken(self.label, figure.strip(), f"{self.second} {self.below}".strip())


@attrs.frozen
class Readout:
    """Everything that the reading's column shows."""

    thdn: Figure
    power: Figure
    level: Figure
    frequency: Figure
    sentence: Sentence


WAITING = Sentence(text.WAITING, text.WAITING_DETAIL, Mark.WITHHELD)
STALE = Sentence(text.STALE, text.STALE_DETAIL, Mark.WITHHELD)


def withheld_readout(sentence: Sentence, how: Withheld = Withheld.DASH) -> Readout:
    """Return a readout without a single digit."""
    return Readout(
        _withheld(text.THDN, how),
        _withheld(text.POWER, how),
        _withheld(text.LEVEL, how),
        _withheld(text.FREQUENCY, how),
        sentence,
    )


def readout_of(reading: Reading, *, tone_on: bool | None) -> Readout:
    """Return what to show for a reading; figures that can't be honest are withheld."""
    sentence = sentence_of(reading, tone_on=tone_on)
    if reading.state is State.OVERLOAD:
        return withheld_readout(sentence, Withheld.HATCH)
    if reading.state is not State.OK:
        return withheld_readout(sentence)
    return Readout(_thdn(reading), _power(reading), _level(reading), _frequency(reading), sentence)


def _withheld(label: str, how: Withheld) -> Figure:
    if how is Withheld.HATCH:
        return Figure(label, "", "", text.WITHHELD, how)
    return Figure(label, figures.DASH, "", "", how)


def _thdn(reading: Reading) -> Figure:
    if reading.thdn is None:
        return _withheld(text.THDN, Withheld.DASH)
    shown = figures.percent(reading.thdn)
    about = text.of_what(reading.settings.reference.value, text.band(*reading.settings.band_hz))
    second = figures.decibels(reading.thdn.value)
    figure = Figure(text.THDN, shown.number, "%", text.plus_minus(shown.plus_minus, "%"), second=second, about=about)
    return _limited(attrs.evolve(figure, quantity=reading.thdn))


def _limited(figure: Figure) -> Figure:
    """Return the figure as a limit where the interface, or noise, is what is seen: never as the amplifier's number."""
    quantity = figure.quantity
    if quantity is None or quantity.limited_by is None:
        return figure
    words = task_text.LIMITED.get(quantity.limited_by, quantity.limited_by)
    second = f"{task_text.AT_MOST} {figure.second}" if figure.second else ""
    return attrs.evolve(figure, number=f"{task_text.AT_MOST} {figure.number}", second=second, below=words)


def load_words(reading: Reading) -> str:
    """Return the load in words, "" where it is not known."""
    ohm = reading.settings.load_ohm
    if ohm is None:
        return ""
    return text.OPEN_LOAD if ohm >= OPEN_OHM else f"{ohm:.3g} Ω"


def _power(reading: Reading) -> Figure:
    ohm = reading.settings.load_ohm
    if reading.power_w is None or ohm is None:
        return Figure(text.POWER, figures.DASH, "", text.NO_POWER, Withheld.DASH)
    if ohm >= OPEN_OHM:
        return Figure(text.POWER, figures.DASH, "", text.NO_LOAD, Withheld.DASH)
    label = text.power_into(load_words(reading))
    return _with_unit(label, reading.power_w, "W")


def _level(reading: Reading) -> Figure:
    if reading.level_vrms is not None:
        figure = _with_unit(text.LEVEL, reading.level_vrms, "V")
        return attrs.evolve(figure, second=figures.decibels(reading.level_vrms.value, "dBV"))
    if reading.level_fs is not None and reading.level_fs.value > 0:
        level = figures.worded(db(reading.level_fs.value), figures.decibel_uncertainty(reading.level_fs), "dBFS", 4)
        return Figure(text.LEVEL, level.number, level.unit, text.plus_minus(level.plus_minus, "dB"))
    return _withheld(text.LEVEL, Withheld.DASH)


def _frequency(reading: Reading) -> Figure:
    if reading.fundamental_hz is None:
        return _withheld(text.FREQUENCY, Withheld.DASH)
    hertz = reading.fundamental_hz
    shown = figures.worded(hertz.value, expanded(hertz), "Hz", 5)
    return Figure(text.FREQUENCY, shown.number, "Hz", text.plus_minus(shown.plus_minus, "Hz"), quantity=hertz)


def _with_unit(label: str, given: Quantity, unit: str) -> Figure:
    shown = figures.quantity(given, unit)
    below = text.plus_minus(shown.plus_minus, shown.unit)
    return _limited(Figure(label, shown.number, shown.unit, below, quantity=given))
