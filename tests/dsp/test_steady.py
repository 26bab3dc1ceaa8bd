"""The steady part of a recording: late starts, early ends, steps, breaks."""

import numpy as np
import pytest

from tests.dsp.waveforms import sine
from wattproof.core.notes import Kind
from wattproof.core.signal import Samples
from wattproof.dsp.steady import Steady, find_steady, movement

RATE_HZ = 48_000.0
FRAMES = 96_000


def _tone(level: Samples | float = 0.5, noise: float = 1e-5) -> Samples:
    rng = np.random.default_rng(1)
    return sine(FRAMES, RATE_HZ, 997.0, peak=level) + rng.normal(0.0, noise, FRAMES)


def _level(first: int, last: int, inside: float = 0.5, outside: float = 0.0) -> Samples:
    level = np.full(FRAMES, outside)
    level[first:last] = inside
    return level


def _kinds(steady: Steady) -> list[Kind]:
    return [note.kind for note in steady.notes]


def test_a_tone_that_stands_is_taken_whole() -> None:
    assert find_steady(_tone(), RATE_HZ, 997.0) == Steady(0, FRAMES)


@pytest.mark.parametrize(
    ("first", "last", "kinds"),
    [
        (30_000, FRAMES, [Kind.STARTS_LATE]),
        (0, 60_000, [Kind.ENDS_EARLY]),
        (30_000, 60_000, [Kind.STARTS_LATE, Kind.ENDS_EARLY]),
    ],
)
def test_what_lies_outside_a_late_start_or_an_early_end_is_left_out(first: int, last: int, kinds: list[Kind]) -> None:
    steady = find_steady(_tone(_level(first, last)), RATE_HZ, 997.0)
    end = steady.first_frame + steady.frames
    assert first <= steady.first_frame <= first + 1500  # within 30 ms, and never outside
    assert last - 1500 <= end <= last
    assert _kinds(steady) == kinds
    places = [dict(note.values)["at_s"] for note in steady.notes]
    edges = [edge / RATE_HZ for edge in (first, last) if edge not in {0, FRAMES}]
    np.testing.assert_allclose(np.array(places, dtype=float), edges, rtol=0, atol=0.03)


@pytest.mark.parametrize("step_db", [-3.0, 0.3, 3.0])
def test_a_level_step_splits_the_recording_and_the_longer_part_is_taken(step_db: float) -> None:
    level = np.full(FRAMES, 0.3)
    level[40_000:] *= 10.0 ** (step_db / 20.0)
    steady = find_steady(_tone(level), RATE_HZ, 997.0)
    assert 40_000 <= steady.first_frame <= 41_500
    assert steady.first_frame + steady.frames == FRAMES
    assert _kinds(steady) == [Kind.LEVEL_STEP]
    said = dict(steady.notes[0].values)
    assert said["db"] == pytest.approx(step_db, rel=0.02, abs=0.01)
    assert said["at_s"] == pytest.approx(40_000 / RATE_HZ, rel=0, abs=0.02)


@pytest.mark.parametrize("lost", [1, 5, 64, 100, 441])
def test_lost_frames_split_the_recording(lost: int) -> None:
    n = np.arange(FRAMES + lost)
    whole = sine(n.size, RATE_HZ, 997.0, peak=0.5)
    broken = np.delete(whole, np.arange(70_000, 70_000 + lost))
    steady = find_steady(broken, RATE_HZ, 997.0)
    assert steady.first_frame == 0
    assert 68_500 <= steady.frames <= 70_000
    assert _kinds(steady) == [Kind.BREAK]
    assert dict(steady.notes[0].values)["at_s"] == pytest.approx(70_000 / RATE_HZ, rel=0, abs=0.02)


@pytest.mark.parametrize("snr_db", [20.0, 30.0, 60.0])
@pytest.mark.parametrize("frequency_hz", [25.0, 100.0, 997.0, 15_000.0])
def test_noise_does_not_break_a_steady_tone(snr_db: float, frequency_hz: float) -> None:
    spread = 0.5 / np.sqrt(2.0) * 10.0 ** (-snr_db / 20.0)
    for seed in range(5):
        noise = np.random.default_rng(seed).normal(0.0, spread, FRAMES)
        found = find_steady(sine(FRAMES, RATE_HZ, frequency_hz, peak=0.5) + noise, RATE_HZ, frequency_hz)
        assert found == Steady(0, FRAMES)


def test_a_slow_fade_is_no_step() -> None:
    level = 0.5 * 10.0 ** (np.linspace(0.0, -6.0, FRAMES) / 20.0)
    assert find_steady(_tone(level), RATE_HZ, 997.0) == Steady(0, FRAMES)


def test_movement_tells_how_far_level_and_phase_range() -> None:
    level = 0.5 * 10.0 ** (np.linspace(0.0, 1.0, FRAMES) / 20.0)
    ranged, wandered = movement(_tone(level), RATE_HZ, 997.0)
    assert ranged == pytest.approx(np.log(10.0) / 20.0, rel=0.03, abs=0)  # 1 dB
    assert wandered < 0.01
    still, _ = movement(_tone(), RATE_HZ, 997.3)  # a carrier 0.3 Hz off turns steadily, which is no movement
    assert still < 1e-3


def test_a_phase_that_wanders_is_told() -> None:
    n = np.arange(FRAMES)
    wow = 0.8 * np.sin(2.0 * np.pi * 0.7 * n / RATE_HZ)
    _, wandered = movement(0.5 * np.sin(2.0 * np.pi * 997.0 * n / RATE_HZ + wow), RATE_HZ, 997.0)
    assert wandered > 1.0


def test_a_recording_of_a_few_pieces_is_taken_as_it_stands() -> None:
    assert find_steady(sine(500, RATE_HZ, 997.0), RATE_HZ, 997.0) == Steady(0, 500)
    assert movement(sine(500, RATE_HZ, 997.0), RATE_HZ, 997.0) == (0.0, 0.0)
