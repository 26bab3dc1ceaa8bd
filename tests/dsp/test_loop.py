"""Tones in all channels, noise densities and sample formats of a loop."""

import numpy as np
import pytest

from wattproof.dsp.loop import densities, sample_format, tones

RATE_HZ = 48_000.0
FRAMES = 48_000


def test_crosstalk_is_read_at_the_frequency_of_the_louder_channel() -> None:
    rng = np.random.default_rng(3)
    theta = 2.0 * np.pi * 997.03 * np.arange(FRAMES) / RATE_HZ
    noise = 1e-6 * rng.standard_normal((FRAMES, 2))
    found = tones(np.stack([np.sin(theta), 1e-5 * np.sin(theta + 1.0)], axis=1) + noise, RATE_HZ, 997.0)
    assert found.frequency_hz == pytest.approx(997.03, rel=1e-8, abs=0.0)
    # noise of 1e-6 over 48 000 frames: √(2/N)·σ = 6.5e-9 (Cramér–Rao)
    assert abs(found.amplitudes[1]) == pytest.approx(1e-5, rel=0.0, abs=4 * 6.5e-9)
    assert found.u[1] == pytest.approx(6.5e-9, rel=0.5, abs=0.0)  # from the median of 40 bins


def test_white_noise_has_its_density_at_every_frequency_with_and_without_a_tone() -> None:
    rng = np.random.default_rng(4)
    noise = 1e-4 * rng.standard_normal((2 * FRAMES, 1))
    theta = 2.0 * np.pi * 997.0 * np.arange(2 * FRAMES) / RATE_HZ
    # closed form: σ spread over half the rate, rms to a full-scale sine's rms
    expected = 1e-4 * np.sqrt(2.0) / np.sqrt(RATE_HZ / 2.0)
    for samples, near_hz in ((noise, None), (noise + 0.5 * np.sin(theta)[:, None], 997.0)):
        found = densities(samples, RATE_HZ, near_hz, 10.0, 20_000.0)
        high = found.frequency_hz > 200.0
        assert np.mean(found.density_fs[0, high] ** 2) == pytest.approx(expected**2, rel=0.05, abs=0.0)


@pytest.mark.parametrize("bits", [16, 20, 24])
def test_the_word_length_is_seen(bits: int) -> None:
    rng = np.random.default_rng(bits)
    codes = rng.integers(-(2 ** (bits - 2)), 2 ** (bits - 2), 4000)
    assert sample_format(codes / 2.0 ** (bits - 1)) == f"{bits} bit"


def test_anything_finer_is_float() -> None:
    assert sample_format(np.array([0.1, 0.2])) == "float"
