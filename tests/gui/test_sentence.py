"""The words on what the residual is made of: each made from a waveform whose harmonics are computed here."""

import math
from collections.abc import Callable

import attrs
import numpy as np
import pytest

from wattproof.core.notes import Kind, note
from wattproof.core.quantity import measured
from wattproof.core.reading import Harmonic, Reading, ReadingSettings, State
from wattproof.core.signal import Samples, Span
from wattproof.gui import text
from wattproof.gui.sentence import Mark, sentence_of

SPAN = Span(0, 4800, 48_000.0)
_POINTS = 4096


def reading_of(shape: Callable[[Samples], Samples], noise: float = 1e-6, hum: float = 1e-6) -> Reading:
    """Return the reading of a sine that went through a shape, with noise and hum as plain ratios."""
    theta = 2 * math.pi * np.arange(_POINTS) / _POINTS
    lines = np.fft.rfft(shape(np.sin(theta))) / (_POINTS / 2)
    turned = lines * 1j  # sin θ has the phase 0
    first = turned[1]
    harmonics = tuple(
        Harmonic(
            order,
            order * 997.0,
            measured(abs(turned[order] / first), 1e-9, "1"),
            float(np.angle(turned[order] * (abs(first) / first) ** order)),
        )
        for order in range(2, 21)
    )
    thd = math.sqrt(sum(harmonic.ratio.value**2 for harmonic in harmonics))
    ratios = {"thd": thd, "noise": noise, "hum": hum, "thdn": math.hypot(thd, noise, hum)}
    quantities = {name: measured(value, 1e-9, "1") for name, value in ratios.items()}
    return Reading(
        span=SPAN,
        channel=1,
        settings=ReadingSettings(),
        state=State.OK,
        harmonics=harmonics,
        thd=quantities["thd"],
        noise=quantities["noise"],
        hum=quantities["hum"],
        thdn=quantities["thdn"],
    )


def clipped(at: float) -> Callable[[Samples], Samples]:
    return lambda sine: np.asarray(np.clip(sine, -at, at))


def dead_zone(width: float) -> Callable[[Samples], Samples]:
    return lambda sine: np.asarray(np.sign(sine) * np.maximum(np.abs(sine) - width, 0.0))


@pytest.mark.parametrize("at", [0.98, 0.9, 0.7, 0.3])
def test_cut_tips_are_called_clipping_however_deep(at: float) -> None:
    sentence = sentence_of(reading_of(clipped(at)), tone_on=True)
    assert sentence.title == text.CLIPPING
    assert sentence.mark is Mark.WARNING


def test_tips_that_are_barely_touched_are_no_warning_yet() -> None:
    sentence = sentence_of(reading_of(clipped(0.995)), tone_on=True)
    assert sentence.title == text.CLIPPING_BEGINS
    assert sentence.mark is Mark.PLAIN


def test_clipping_is_seen_beside_a_weaker_dead_zone() -> None:
    def both(sine: Samples) -> Samples:
        return np.asarray(np.clip(dead_zone(0.005)(sine), -0.9, 0.9))

    assert sentence_of(reading_of(both), tone_on=True).title == text.CLIPPING


def test_one_sided_clipping_is_clipping_too() -> None:
    sentence = sentence_of(reading_of(lambda sine: np.minimum(sine, 0.9)), tone_on=True)
    assert sentence.title == text.CLIPPING


@pytest.mark.parametrize("width", [0.002, 0.02, 0.1])
def test_a_dead_zone_is_called_crossover_and_never_clipping(width: float) -> None:
    sentence = sentence_of(reading_of(dead_zone(width)), tone_on=True)
    assert sentence.title == text.CROSSOVER
    assert sentence.mark is Mark.PLAIN


def test_a_bend_is_named_by_its_harmonic() -> None:
    assert sentence_of(reading_of(lambda s: s + 0.02 * s**2), tone_on=True).title == text.EVEN
    assert sentence_of(reading_of(lambda s: s - 0.02 * s**3), tone_on=True).title == text.ODD


def test_noise_and_hum_are_named_with_their_share() -> None:
    noisy = sentence_of(reading_of(lambda s: s, noise=1e-3, hum=3e-4), tone_on=True)
    assert noisy.title == text.NOISE
    assert "noise\u00a092\u00a0%" in noisy.detail  # 1/(1 + 0.09)
    assert sentence_of(reading_of(lambda s: s, noise=1e-4, hum=3e-4), tone_on=True).title == text.HUM_TITLE
    assert sentence_of(reading_of(lambda s: s, noise=1e-4, hum=1e-4), tone_on=True).title == text.MIXED


def test_a_moving_level_is_told() -> None:
    moving = attrs.evolve(reading_of(clipped(0.9)), moving_db_per_s=-6.2)
    assert "6 dB/s" in sentence_of(moving, tone_on=True).detail


def test_an_overload_blames_the_interface_and_says_the_way_out() -> None:
    notes = (note(Kind.OVERLOADED, percent=2.0, longest_frames=9.0, add_db=10.0),)
    reading = Reading(span=SPAN, channel=1, settings=ReadingSettings(), state=State.OVERLOAD, notes=notes)
    sentence = sentence_of(reading, tone_on=True)
    assert sentence.title == "The interface is overloaded, not the amplifier"
    assert "10\u00a0dB of attenuation" in sentence.detail
    assert sentence.mark is Mark.OVERLOAD


@pytest.mark.parametrize("state", [state for state in State if state not in (State.OK, State.OVERLOAD)])
def test_every_other_state_has_words_of_its_own(state: State) -> None:
    reading = Reading(span=SPAN, channel=1, settings=ReadingSettings(), state=state)
    sentence = sentence_of(reading, tone_on=True)
    assert sentence.title
    assert sentence.detail
    assert sentence.mark is Mark.WITHHELD
    assert "overload" not in sentence.title.lower()


def test_a_silent_tone_is_told_from_one_that_is_lost() -> None:
    reading = Reading(span=SPAN, channel=1, settings=ReadingSettings(), state=State.NO_TONE)
    assert sentence_of(reading, tone_on=False).title == text.NO_TONE_OFF
    assert sentence_of(reading, tone_on=True).title == text.NO_TONE_ON
