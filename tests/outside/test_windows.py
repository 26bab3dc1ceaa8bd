"""Noise bandwidth of the windows in use against their definition, closed forms and a general library."""

import numpy as np
import pytest
from scipy.signal import windows

from wattproof.dsp.band import TAPERED, excess_variance, noise_bandwidth_bins, taper
from wattproof.dsp.start import hann


@pytest.mark.parametrize("frames", [1000, 4800, 23_437])
def test_the_hann_window_has_a_noise_bandwidth_of_one_and_a_half_bins(frames: int) -> None:
    window = hann(frames)
    bandwidth = frames * np.sum(window**2) / np.sum(window) ** 2  # definition: N·Σw²/(Σw)²
    assert bandwidth == pytest.approx(1.5, rel=1e-12, abs=0)  # closed form 1 + c1²/(2c0²), periodic form
    np.testing.assert_allclose(window, windows.hann(frames, sym=False), rtol=0, atol=1e-15)  # scipy.signal.windows


@pytest.mark.parametrize("frames", [1000, 4800, 23_437, 96_000])
def test_the_taper_has_the_noise_bandwidth_that_its_figures_state(frames: int) -> None:
    window = taper(frames)
    power = np.abs(np.fft.fft(window, 4 * frames)) ** 2
    by_transform = power.mean() * frames / power[0]  # definition in frequency: ∫|W|² / |W(0)|², in bins
    assert noise_bandwidth_bins(frames) == pytest.approx(by_transform, rel=1e-12, abs=0)


@pytest.mark.parametrize("frames", [4000, 24_000, 96_000])
def test_the_taper_is_the_cosine_taper_of_a_general_library(frames: int) -> None:
    ours, theirs = taper(frames), windows.tukey(frames, TAPERED, sym=False)  # scipy.signal.windows
    # ours samples the slope half a frame later, so that it is symmetrical: a phase of π·½/(N/8)
    np.testing.assert_allclose(ours / ours.max(), theirs, rtol=0, atol=1.01 * np.pi / 2.0 / (frames / 8.0))
    # closed form of the continuous taper: ∫w = 1 − α/2, ∫w² = 1 − 5α/8, ∫w⁴ = 1 − 93α/128 for a share α that is tapered
    mean, square, fourth = 1 - TAPERED / 2, 1 - 5 * TAPERED / 8, 1 - 93 * TAPERED / 128
    assert noise_bandwidth_bins(frames) == pytest.approx(square / mean**2, rel=1e-3, abs=0)
    assert excess_variance(frames) == pytest.approx(fourth / square**2, rel=1e-3, abs=0)


def test_the_taper_keeps_the_power_of_noise() -> None:
    assert np.mean(taper(24_000) ** 2) == pytest.approx(1.0, rel=1e-12, abs=0)  # so that a sum of bins is a mean square
