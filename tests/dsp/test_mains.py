"""Hum told from noise and from the tone's own harmonics."""

import numpy as np
import pytest

from tests.dsp.waveforms import sine
from wattproof.core.signal import Samples
from wattproof.dsp.band import noise_spectrum
from wattproof.dsp.fit import block_of
from wattproof.dsp.mains import Hum, contains_mains, find_hum, quick_hum

RATE_HZ = 48_000.0
BAND_HZ = (20.0, 20_000.0)
NOISE = 1e-5


def _hum(mains_hz: float, numbers: tuple[int, ...], peak: float = 1e-3, seconds: float = 1.0) -> Samples:
    frames = round(seconds * RATE_HZ)
    noise = np.random.default_rng(1).normal(0.0, NOISE, frames)
    lines = [peak * sine(frames, RATE_HZ, number * mains_hz, phase_rad=float(number)) for number in numbers]
    return np.asarray(np.sum([noise, *lines], axis=0))


def _found(samples: Samples, tone_hz: float | None = 997.0) -> Hum | None:
    block = block_of(samples[:, None])
    return find_hum(block, noise_spectrum(block, RATE_HZ).power[0], RATE_HZ, tone_hz, BAND_HZ)


@pytest.mark.parametrize("mains_hz", [49.8, 50.0, 50.17, 59.9, 60.0, 60.06])
@pytest.mark.parametrize("numbers", [(1,), (2, 4, 6), (1, 3, 5, 40)])
def test_lines_are_found_with_their_frequency_and_height(mains_hz: float, numbers: tuple[int, ...]) -> None:
    hum = _found(_hum(mains_hz, numbers))
    assert hum is not None
    assert hum.frequency_hz == pytest.approx(mains_hz, rel=1e-4, abs=0)
    assert hum.numbers == numbers
    np.testing.assert_allclose(hum.mean_squares, 0.5e-6, rtol=0.01, atol=0)
    assert hum.waveform is not None
    assert np.mean(hum.waveform**2) == pytest.approx(0.5e-6 * len(numbers), rel=0.01, abs=0)


def test_noise_alone_shows_no_hum() -> None:
    rng = np.random.default_rng(2)
    found = [_found(rng.normal(0.0, NOISE, 24_000)) for _ in range(40)]
    assert sum(hum is not None for hum in found) <= 1  # a line of chance e^−30·(bins looked at): none is expected


def test_a_line_that_a_harmonic_may_hide_is_left_to_the_harmonic() -> None:
    hum = _found(_hum(50.0, (1, 2, 20)), tone_hz=1000.0)  # number 20 falls on the tone
    assert hum is not None
    assert hum.numbers == (1, 2)


def test_a_short_block_tells_no_hum_from_noise() -> None:
    assert _found(_hum(50.0, (1,), seconds=0.15)) is None


@pytest.mark.parametrize(
    ("frequency_hz", "mains_hz", "seconds", "may"),
    [
        (2000.0, 50.0, 10.0, True),  # the 40th of 50 Hz, whatever the time
        (1994.0, 50.0, 1.0, False),  # 6 Hz off is 6/T
        (1994.0, 50.0, 0.25, True),  # 1.5/T
        (1980.0, None, 1.0, True),  # the 33rd of 60 Hz, where the mains is not known
        (1980.0, 50.0, 1.0, False),
        (19_950.0, 50.0, 1.0, False),  # hum reaches no further than its hundredth line
    ],
)
def test_a_harmonic_nearer_than_two_over_t_may_contain_mains(
    frequency_hz: float, mains_hz: float | None, seconds: float, *, may: bool
) -> None:
    assert contains_mains(frequency_hz, mains_hz, seconds) is may


@pytest.mark.parametrize("mains_hz", [49.95, 50.0, 60.02])
def test_the_quick_look_moves_lines_from_noise_to_hum(mains_hz: float) -> None:
    block = block_of(_hum(mains_hz, (1, 3), seconds=0.26)[:, None])
    spectrum = noise_spectrum(block, RATE_HZ)
    (hum,), left = quick_hum(spectrum, 997.0, BAND_HZ)
    assert hum is not None
    assert hum.numbers == (1, 3)
    assert hum.frequency_hz == round(mains_hz, -1)
    np.testing.assert_allclose(hum.mean_squares, 0.5e-6, rtol=0.03, atol=0)  # a few bins hold 98 % of a line
    whole, rest = float(spectrum.power.sum()), float(left.power.sum())
    assert rest + sum(hum.mean_squares) == pytest.approx(whole, rel=1e-3, abs=0)
    assert rest < 0.05 * whole


def test_the_quick_look_leaves_lines_outside_the_band_alone() -> None:
    block = block_of(_hum(50.0, (1, 3), seconds=0.26)[:, None])
    (hum,), _ = quick_hum(noise_spectrum(block, RATE_HZ), 997.0, (100.0, 20_000.0))
    assert hum is not None
    assert hum.numbers == (3,)
    nothing, _ = quick_hum(noise_spectrum(block, RATE_HZ), 997.0, (200.0, 20_000.0))
    assert nothing == (None,)
