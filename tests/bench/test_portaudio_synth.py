"""What the callback sounds is one and the same however its blocks are cut, and every change of it is a ramp."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray

from tests.bench.expected_tone import CYCLE, RAMP_S, largest_step, ramp, sine
from wattproof.bench.portaudio.synth import CYCLE as TURN
from wattproof.bench.portaudio.synth import Synth
from wattproof.signals.ramp import RAMP_S as SIGNALS_RAMP_S
from wattproof.signals.ramp import raised_cosine

RATE_HZ = 48_000
RAMP = round(RAMP_S * RATE_HZ)
STEPS = 2_731  # 1000.1 Hz
STEP = STEPS * TURN // CYCLE
OTHER = 7_001 * TURN // CYCLE
MARKER = np.linspace(-1.0, 1.0, 8_192, dtype=np.float32)
BLOCKS = st.lists(st.integers(1, 5_000), min_size=1, max_size=8)


def render(synth: Synth, frames: int) -> NDArray[np.float32]:
    out = np.full((frames, 2), np.nan, dtype=np.float32)
    synth.render(out)
    return out


def test_the_ramp_is_the_same_as_that_of_the_other_benches() -> None:
    assert RAMP_S == SIGNALS_RAMP_S
    np.testing.assert_allclose(ramp(RAMP), raised_cosine(RAMP), rtol=0.0, atol=1e-15)  # rounding of two formulas


@given(BLOCKS, BLOCKS, BLOCKS, BLOCKS)
def test_blocks_of_any_size_join_to_the_same_samples(
    first: list[int], second: list[int], third: list[int], fourth: list[int]
) -> None:
    cut, whole = Synth(RATE_HZ, 2, MARKER), Synth(RATE_HZ, 2, MARKER)
    for serial, (blocks, gains) in enumerate(((first, [0.5, 0.0]), (second, [0.25, 1.0]), (third, [0.0, 0.0])), 1):
        for synth in (cut, whole):
            synth.tone(serial, STEP if serial < 3 else OTHER, gains)
        np.testing.assert_array_equal(
            np.concatenate([render(cut, frames) for frames in blocks]), render(whole, sum(blocks))
        )
    for synth in (cut, whole):
        synth.fade()
    np.testing.assert_array_equal(
        np.concatenate([render(cut, frames) for frames in fourth]), render(whole, sum(fourth))
    )


def test_phase_is_exact_after_a_day() -> None:
    synth = Synth(RATE_HZ, 2, MARKER)
    synth.tone(1, STEP, [1.0, 1.0])
    render(synth, RAMP)
    day = 24 * 3600 * RATE_HZ
    synth._new.phase = day * STEP % TURN  # noqa: SLF001 - a day is not rendered here: the phase counts in whole numbers
    np.testing.assert_array_equal(render(synth, 500)[:, 0], sine(STEPS, day, 500).astype(np.float32))


def test_a_tone_begins_at_phase_0_where_its_ramp_begins_and_tells_the_frame() -> None:
    synth = Synth(RATE_HZ, 2, MARKER)
    np.testing.assert_array_equal(render(synth, 777), 0.0)
    synth.tone(5, STEP, [0.0, 0.5])
    out = render(synth, 2_000)
    expected = 0.5 * sine(STEPS, 0, 2_000)
    expected[:RAMP] *= ramp(RAMP)
    assert (synth.answered, synth.answer_frame) == (5, 777)
    np.testing.assert_array_equal(out[:, 1], expected.astype(np.float32))
    np.testing.assert_array_equal(out[:, 0], 0.0)


@given(st.integers(0, 3 * RAMP), st.integers(0, 3 * RAMP), st.integers(0, 3 * RAMP))
def test_no_change_steps_further_than_a_ramp(until_change: int, until_fade: int, until_next: int) -> None:
    synth = Synth(RATE_HZ, 2, MARKER)
    synth.tone(1, STEP, [1.0, 1.0])
    parts = [render(synth, until_change)]
    synth.tone(2, OTHER, [0.5, 1.0])
    parts.append(render(synth, until_fade))
    synth.fade()
    parts.append(render(synth, until_next))
    synth.tone(3, STEP, [1.0, 0.0])
    parts.append(render(synth, 5 * RAMP))
    out = np.concatenate(parts).astype(np.float64)
    bound = largest_step(1.0, STEPS * RATE_HZ / CYCLE, RATE_HZ) + largest_step(1.0, 7_001 * RATE_HZ / CYCLE, RATE_HZ)
    assert np.abs(np.diff(out, axis=0)).max() <= bound
    assert np.abs(out).max() <= 1.0  # a cross-fade never exceeds the larger tone
    assert synth.answered == 3
    assert np.abs(out[-RAMP:, 0]).max() == pytest.approx(1.0, rel=0.0, abs=0.01)  # the tone asked for last stands


@given(st.integers(0, 2 * RAMP))
def test_a_fade_is_silent_after_one_ramp_wherever_it_begins(when: int) -> None:
    synth = Synth(RATE_HZ, 2, MARKER)
    synth.tone(1, STEP, [1.0, 1.0])
    render(synth, 1)
    synth.tone(2, OTHER, [1.0, 1.0])
    render(synth, when)
    synth.fade()
    render(synth, RAMP)
    assert synth.silent
    np.testing.assert_array_equal(render(synth, 1_000), 0.0)
    assert synth.answered == 2  # a request that the fade swept away is answered: nobody waits for it


def test_a_change_of_level_alone_keeps_the_phase() -> None:
    synth = Synth(RATE_HZ, 2, MARKER)
    synth.tone(1, STEP, [0.5, 0.5])
    render(synth, 1_000)
    synth.tone(2, STEP, [0.25, 0.25])
    out = render(synth, 1_000)
    np.testing.assert_array_equal(out[RAMP:, 0], (0.25 * sine(STEPS, 1_000 + RAMP, 1_000 - RAMP)).astype(np.float32))


def test_the_marker_sounds_once_and_never_over_a_tone() -> None:
    synth = Synth(RATE_HZ, 2, MARKER)
    synth.sound_marker(1, 5_000, [0.0, 0.01])
    out = render(synth, 6_000)
    np.testing.assert_array_equal(out[:5_000, 1], (0.01 * MARKER[:5_000].astype(np.float64)).astype(np.float32))
    np.testing.assert_array_equal(out[5_000:], 0.0)
    synth.tone(2, STEP, [0.5, 0.5])
    with_tone = render(synth, 2_000)
    synth.sound_marker(3, 5_000, [0.01, 0.01])
    np.testing.assert_array_equal(render(synth, 2_000)[:, 0], (0.5 * sine(STEPS, 2_000, 2_000)).astype(np.float32))
    assert synth.answered == 3
    assert np.abs(with_tone).max() > 0.49
