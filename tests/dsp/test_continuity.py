"""Lost, repeated and replaced frames are found by the tone's content alone, and a sound tone is left in peace."""

import math

import numpy as np
import pytest

from wattproof.core.signal import Samples
from wattproof.dsp.continuity import NEAR, Continuity, least_step_rad

FREQUENCY_HZ = 997.0
SNR_DB = 40.0


def tone(
    rate_hz: int, seconds: float, seed: int, snr_db: float = SNR_DB, frequency_hz: float = FREQUENCY_HZ
) -> tuple[Samples, float]:
    """Return a tone of peak 0.5 in white noise, shape (frames, 2), the second channel weaker; and its phase."""
    rng = np.random.default_rng(seed)
    frames, phase = round(seconds * rate_hz), float(rng.random())
    return shifted(rate_hz, frames, phase, 0, 0, frequency_hz) + noise(rng, frames, snr_db), phase


def noise(rng: np.random.Generator, frames: int, snr_db: float) -> Samples:
    return rng.normal(0.0, 0.5 / math.sqrt(2.0) * 10.0 ** (-snr_db / 20.0), (frames, 2))


def shifted(  # noqa: PLR0913, PLR0917 - a tone and where it breaks
    rate_hz: int, frames: int, phase: float, at: int, by: int, frequency_hz: float = FREQUENCY_HZ
) -> Samples:
    """Return a tone that from frame `at` on is `by` frames ahead (lost) or behind (repeated)."""
    place = np.arange(frames)
    place[at:] += by
    wave = 0.5 * np.sin(2.0 * np.pi * ((frequency_hz / rate_hz * place + phase) % 1.0))
    return np.stack([wave, 0.1 * wave], axis=1)


def followed(samples: Samples, rate_hz: int, frequency_hz: float = FREQUENCY_HZ, blocks: int = 7) -> Continuity:
    witness = Continuity(rate_hz, frequency_hz)
    for block in np.array_split(samples, blocks):
        witness.pieces.take(block)
    return witness


@pytest.mark.parametrize(("rate_hz", "step"), [(48_000, 1), (96_000, 3)])
def test_every_loss_and_every_repetition_of_1_to_1024_frames_is_found(rate_hz: int, step: int) -> None:
    frames = rate_hz
    rng = np.random.default_rng(rate_hz)
    noises = [noise(rng, frames, SNR_DB) for _ in range(16)]
    missed = []
    for count in {*range(1, 1_025, step), 337, 674, 1_024}:
        by = count if (count + rate_hz // 48_000) % 2 else -count  # what one rate loses the other repeats
        at = frames // 2 + int(rng.integers(-2_000, 2_000))
        samples = shifted(rate_hz, frames, float(rng.random()), at, by) + noises[count % len(noises)]
        found = followed(samples, rate_hz, blocks=1).look(0, frames).found
        if found is None or not found.first_frame <= at <= found.first_frame + found.frames:
            missed.append((by, at, found))
    assert missed == []


@pytest.mark.parametrize(("by", "at_share"), [(337, 0.5), (-337, 0.5), (337, 0.4), (48, 0.9), (-1, 0.93), (1_000, 0.1)])
def test_a_break_is_found_wherever_there_is_enough_of_the_tone_to_both_sides(by: int, at_share: float) -> None:
    rate_hz = 48_000
    frames = 2 * rate_hz
    at = round(at_share * frames)
    samples = shifted(rate_hz, frames, 0.3, at, by) + noise(np.random.default_rng(7), frames, SNR_DB)
    witness = Continuity(rate_hz, FREQUENCY_HZ)
    found = None
    for end in range(rate_hz // 20, frames + 1, rate_hz // 20):  # as blocks come, each looked at when it is there
        witness.pieces.take(samples[end - rate_hz // 20 : end])
        found = witness.look(max(0, end - rate_hz // 2), end).found
        if found is not None:
            break
    assert found is not None
    assert found.first_frame <= at <= found.first_frame + found.frames


@pytest.mark.parametrize(("rate_hz", "blocks"), [(48_000, 600), (96_000, 200)])
def test_fewer_than_one_in_two_hundred_sound_blocks_is_called_broken(rate_hz: int, blocks: int) -> None:
    wrong = 0
    for seed in range(blocks):
        samples, _ = tone(rate_hz, 1.0, seed)
        wrong += followed(samples, rate_hz, blocks=1).look(0, rate_hz).found is not None
    assert wrong < 0.005 * blocks


@pytest.mark.parametrize("snr_db", [40.0, 60.0, 100.0])
def test_a_sound_stretch_is_cleared_and_a_broken_one_never(snr_db: float) -> None:
    rate_hz, first, end = 48_000, 23_000, 25_000
    broken_at = 24_000
    for seed in range(20):
        sound, phase = tone(rate_hz, 1.1, seed, snr_db)
        assert followed(sound, rate_hz).judge(first, end).clear
        by = (1, 64, 128, 256, 337, 512, 1_024)[seed % 7]
        broken = shifted(rate_hz, len(sound), phase, broken_at, by)
        broken += noise(np.random.default_rng(seed), len(sound), snr_db)
        verdict = followed(broken, rate_hz).judge(first, end)
        assert verdict.found is not None
        assert not verdict.clear


@pytest.mark.parametrize("replaced_by", ["zeros", "what came before"])
@pytest.mark.parametrize("count", [16, 64, 256, 1_024])
def test_replaced_frames_are_found_where_they_are_suspected(replaced_by: str, count: int) -> None:
    rate_hz, at = 96_000, 48_000
    samples, _ = tone(rate_hz, 1.0, count)
    samples[at : at + count] = 0.0 if replaced_by == "zeros" else samples[at - count : at].copy()
    verdict = followed(samples, rate_hz).judge(at - 1_000, at + 2_000)
    assert verdict.found is not None
    assert verdict.found.first_frame <= at + count
    assert at <= verdict.found.first_frame + verdict.found.frames


def test_a_period_that_was_replaced_by_another_is_found_unsuspected() -> None:
    rate_hz, at, count = 96_000, 48_000, 1_024
    samples, _ = tone(rate_hz, 1.0, 3, 80.0)
    samples[at : at + count] = samples[at - count : at].copy()
    found = followed(samples, rate_hz).look(0, rate_hz).found
    assert found is not None
    assert abs(found.first_frame - at) < 4 * 480


def test_too_little_around_a_suspect_stretch_says_neither() -> None:
    samples, _ = tone(48_000, 1.0, 1)
    witness = followed(samples, 48_000)
    hop = witness.pieces.hop
    assert witness.judge(3 * hop, 5 * hop).clear is False
    assert witness.judge(48_000 - (NEAR // 2) * hop, 48_000 - 2 * hop).clear is False
    assert witness.judge(48_000, 50_000).clear is False


def test_where_whole_periods_may_be_missing_nothing_is_cleared() -> None:
    samples, _ = tone(48_000, 1.0, 1, 80.0, 1_000.0)
    verdict = followed(samples, 48_000, 1_000.0).judge(23_000, 25_000)
    assert least_step_rad(1_000.0, 48_000.0) < 1e-9  # 48 frames are one period
    assert verdict.found is None
    assert not verdict.clear


def test_the_smallest_step_at_997_hz_is_that_of_337_frames_at_48_khz() -> None:
    # closed form: 337 · 997 / 48,000 = 7 − 11/48,000 cycles
    assert least_step_rad(997.0, 48_000.0) == pytest.approx(2.0 * math.pi * 11.0 / 48_000.0, rel=1e-9, abs=0.0)


def test_silence_and_noise_are_neither_broken_nor_cleared() -> None:
    rng = np.random.default_rng(5)
    for samples in (np.zeros((48_000, 2)), rng.normal(0.0, 0.1, (48_000, 2))):
        witness = followed(samples, 48_000)
        assert witness.look(0, 48_000).found is None
        verdict = witness.judge(20_000, 22_000)
        assert verdict.found is None
        assert not verdict.clear


def test_a_hand_on_the_knob_and_a_scratch_are_no_loss() -> None:
    rate_hz = 48_000
    samples, _ = tone(rate_hz, 1.0, 2, 80.0)
    turned = samples * (10.0 ** (np.linspace(-10.0, 0.0, rate_hz) / 20.0))[:, None]
    assert followed(turned, rate_hz).look(0, rate_hz).found is None
    scratched = samples.copy()
    scratched[20_000:20_300] *= 0.05
    assert followed(scratched, rate_hz).look(0, rate_hz).found is None
    stepped = samples.copy()
    stepped[24_000:] *= 0.9
    assert followed(stepped, rate_hz).look(0, rate_hz).found is None


@pytest.mark.parametrize(("frequency_hz", "seconds"), [(103.0, 2.0), (20.3, 4.0), (6_659.0, 1.0)])
def test_other_frequencies_are_followed_with_pieces_to_their_measure(frequency_hz: float, seconds: float) -> None:
    rate_hz = 48_000
    frames = round(seconds * rate_hz)
    for seed, by in enumerate((7, 100, -64, 512, -1_024)):
        samples = shifted(rate_hz, frames, 0.1, frames // 2, by, frequency_hz)
        samples += noise(np.random.default_rng(seed), frames, 60.0)
        found = followed(samples, rate_hz, frequency_hz).look(0, frames).found
        assert found is not None
        assert found.first_frame <= frames // 2 <= found.first_frame + found.frames
        sound, _ = tone(rate_hz, seconds, seed, 60.0, frequency_hz)
        assert followed(sound, rate_hz, frequency_hz).look(0, frames).found is None
