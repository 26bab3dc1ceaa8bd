"""Chooses the sentence on what the residual is made of, by plain comparisons of one reading. Pure."""

import math
from enum import StrEnum

import attrs

from wattproof.core.notes import Kind
from wattproof.core.reading import Harmonic, Reading, Remark, State
from wattproof.gui import text
from wattproof.gui.figures import decibels

_MAIN_SHARE = 0.6  # of the residual's power: what a title may call "mostly"; common practice, no source
_AUDIBLE_KNEE = 0.003  # THD+N from which an edge is called clipping; common practice, no source
_EDGE_WITHIN = 0.02  # harmonics within 34 dB of the strongest: a corner in the waveform has many, a bend has few
_EDGE_COUNT = 3
_MOVING_DB_PER_S = 0.5  # slower than this is no news


class Mark(StrEnum):
    """How a sentence is marked: by shape and word, never by colour alone."""

    PLAIN = "plain"
    WARNING = "warning"
    WITHHELD = "withheld"
    OVERLOAD = "overload"


@attrs.frozen
class Sentence:
    """A title, one line of detail, and a mark."""

    title: str
    detail: str
    mark: Mark


_WITHHELD = {
    State.UNSTEADY: Sentence(text.UNSTEADY, text.UNSTEADY_DETAIL, Mark.WITHHELD),
    State.TOO_SHORT: Sentence(text.TOO_SHORT, text.TOO_SHORT_DETAIL, Mark.WITHHELD),
    State.GAP: Sentence(text.GAP, text.GAP_DETAIL, Mark.WITHHELD),
}


_NO_TONE = {
    None: Sentence(text.NO_TONE_RECORDED, text.NO_TONE_RECORDED_DETAIL, Mark.WITHHELD),
    True: Sentence(text.NO_TONE_ON, text.NO_TONE_ON_DETAIL, Mark.WITHHELD),
    False: Sentence(text.NO_TONE_OFF, text.NO_TONE_OFF_DETAIL, Mark.WITHHELD),
}


def sentence_of(reading: Reading, *, tone_on: bool | None) -> Sentence:
    """Return the words for one reading, whatever its state; `tone_on` is None where the bench can't sound a tone."""
    if reading.state is State.NO_TONE:
        return _NO_TONE[tone_on]
    if reading.state is State.OVERLOAD:
        return Sentence(text.OVERLOAD, text.overload_way_out(_attenuation_db(reading)), Mark.OVERLOAD)
    if reading.state is not State.OK:
        return _WITHHELD[reading.state]
    found = _made_of(reading)
    if abs(reading.moving_db_per_s) >= _MOVING_DB_PER_S:
        return attrs.evolve(found, detail=text.moving(reading.moving_db_per_s))
    remark = next((words for words in map(text.note, reading.notes) if words), "")
    return attrs.evolve(found, detail=f"{found.detail} {remark}".strip())


def _attenuation_db(reading: Reading) -> float | None:
    noted = (dict(note.values).get("add_db") for note in reading.notes if note.kind is Kind.OVERLOADED)
    return next((value for value in noted if isinstance(value, float)), None)


def _made_of(reading: Reading) -> Sentence:
    harmonics, hum, noise = (_power(q.value if q else 0.0) for q in (reading.thd, reading.hum, reading.noise))
    whole = harmonics + hum + noise
    if whole <= 0:
        return Sentence(text.NO_RESIDUAL, "", Mark.PLAIN)
    detail = text.of_power(text.shares(harmonics / whole, hum / whole, noise / whole))
    if harmonics >= _MAIN_SHARE * whole:
        return _harmonics(reading, detail)
    if hum >= _MAIN_SHARE * whole:
        return Sentence(text.HUM_TITLE, detail, Mark.PLAIN)
    if noise >= _MAIN_SHARE * whole:
        return Sentence(text.NOISE, detail, Mark.PLAIN)
    return Sentence(text.MIXED, detail, Mark.PLAIN)


def _power(ratio: float) -> float:
    return ratio * ratio


def _harmonics(reading: Reading, shares: str) -> Sentence:
    seen = [h for h in reading.harmonics if h.remark is not Remark.NOT_SEEN and h.ratio.value > 0]
    if not seen:
        return Sentence(text.HARMONICS, shares, Mark.PLAIN)
    strongest = sorted(seen, key=lambda h: -h.ratio.value)
    listed = text.listed([(h.order, decibels(h.ratio.value, places=0)) for h in strongest[:3]])
    if _has_edge(strongest):
        if _bites_at_zero(seen):
            return Sentence(text.CROSSOVER, text.kink_share(text.CROSSOVER_DETAIL, listed), Mark.PLAIN)
        if reading.thdn is not None and reading.thdn.value >= _AUDIBLE_KNEE:
            return Sentence(text.CLIPPING, text.kink_share(text.CLIPPING_DETAIL, listed), Mark.WARNING)
        return Sentence(text.CLIPPING_BEGINS, text.kink_share(text.CLIPPING_BEGINS_DETAIL, listed), Mark.PLAIN)
    return _bend(strongest, listed)


def _bend(strongest: list[Harmonic], listed: str) -> Sentence:
    whole = sum(_power(h.ratio.value) for h in strongest)
    if _power(strongest[0].ratio.value) >= _MAIN_SHARE * whole and strongest[0].order in (2, 3):
        title, why = {2: (text.EVEN, text.EVEN_DETAIL), 3: (text.ODD, text.ODD_DETAIL)}[strongest[0].order]
        return Sentence(title, text.kink_share(why, listed), Mark.PLAIN)
    return Sentence(text.HARMONICS, f"{listed}.", Mark.PLAIN)


def _has_edge(strongest: list[Harmonic]) -> bool:
    """Return whether high orders stay near the strongest: a corner, no smooth bend."""
    near = [h for h in strongest if h.order >= 4 and h.ratio.value >= _EDGE_WITHIN * strongest[0].ratio.value]
    return len(near) >= _EDGE_COUNT


def _bites_at_zero(seen: list[Harmonic]) -> bool:
    """Return whether the residual bites at the zero crossings (a dead zone) rather than at the tips (clipping).

    Closed form: short pulses that cut the tips of sin θ have odd harmonics of the signs + − + −… (orders 3, 5, 7, 9…),
    pulses against the wave on both sides of its zero crossings have all of them negative.
    """
    odd = [(harmonic.order, harmonic.ratio.value * math.cos(harmonic.phase_rad)) for harmonic in seen]
    tips = sum(part if order % 4 == 3 else -part for order, part in odd if order % 2)
    zero = -sum(part for order, part in odd if order % 2)
    return zero > tips
