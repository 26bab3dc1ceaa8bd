"""The picture of a block: a residual that stands still, and spectrum columns that keep every peak."""

import numpy as np
import pytest

from tests.dsp.waveforms import capture, sine
from wattproof.core.picture import Picture
from wattproof.core.reading import ReadingSettings
from wattproof.dsp.live import LiveReader

RATE_HZ = 96_000.0
HARMONICS = {2: (1e-3, 0.7), 3: (5e-4, -1.0), 5: (3e-4, 2.0)}


def _picture(start_frame: int, frequency_hz: float = 997.0, phase_rad: float = 0.0, noise: float = 0.0) -> Picture:
    frames = 24_500
    samples = sine(
        frames, RATE_HZ, frequency_hz, peak=0.5, harmonics=HARMONICS, start_frame=start_frame, phase_rad=phase_rad
    )
    samples += np.random.default_rng(start_frame).normal(0.0, 1.0, frames) * noise + 0.01
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    _, picture = reader.take(capture(samples, rate_hz=RATE_HZ, first_frame=start_frame), 1)
    assert picture is not None
    return picture


def _expected(phase_cycles: np.ndarray) -> np.ndarray:
    theta = 2.0 * np.pi * phase_cycles
    return np.asarray(sum(ratio * np.sin(order * theta + phase) for order, (ratio, phase) in HARMONICS.items()))


@pytest.mark.parametrize("start_frame", [0, 1, 37, 4321, 96_017])
@pytest.mark.parametrize("frequency_hz", [30.0, 997.0, 1000.0, 6650.0])
def test_the_residual_is_the_same_waveform_wherever_the_block_starts(start_frame: int, frequency_hz: float) -> None:
    picture = _picture(start_frame, frequency_hz, phase_rad=0.3 * start_frame)
    assert picture.phase_cycles[0] >= -1e-6
    assert picture.phase_cycles[0] < 1.0 / (RATE_HZ / frequency_hz) + 1e-6  # the first sample after the zero crossing
    assert picture.phase_cycles[-1] == pytest.approx(2.0, rel=0, abs=2.0 * frequency_hz / RATE_HZ + 1e-3)
    theta = 2.0 * np.pi * picture.phase_cycles
    parts = {order: ratio * np.sin(order * theta + phase) for order, (ratio, phase) in HARMONICS.items()}
    # the residual is what the reading counts: harmonics beyond the band are in the output alone
    in_band = sum(part for order, part in parts.items() if order * frequency_hz <= 20_000.0)
    np.testing.assert_allclose(picture.residual, in_band, rtol=0, atol=1e-6)
    np.testing.assert_allclose(picture.output, np.sin(theta) + sum(parts.values()), rtol=0, atol=1e-6)


def test_the_figures_stay_of_a_size_that_a_screen_can_draw() -> None:
    picture = _picture(0, 30.0)
    assert picture.phase_cycles.size == picture.residual.size == picture.output.size <= 1300
    assert picture.spectrum_hz.size == picture.spectrum_ratio.size <= 700


def test_the_spectrum_keeps_a_lone_peak_and_states_its_window() -> None:
    frames = 24_500
    line = 0.5e-4 * sine(frames, RATE_HZ, 15_432.1)
    noise = np.random.default_rng(1).normal(0.0, 1e-6, frames)
    samples = sine(frames, RATE_HZ, 997.0, peak=0.5) + line + noise
    _, picture = LiveReader(RATE_HZ, (ReadingSettings(),)).take(capture(samples, rate_hz=RATE_HZ), 1)
    assert picture is not None
    peak = int(np.argmax(picture.spectrum_ratio))
    assert picture.spectrum_hz[peak] == pytest.approx(15_432.1, rel=0.01, abs=0)
    # a line falls between two bins by half a bin at most, where the taper loses 3 dB or less, and reads 1e-4 otherwise
    assert 0.7e-4 < picture.spectrum_ratio[peak] < 1.05e-4
    assert picture.noise_bandwidth_hz == pytest.approx(1.102 * RATE_HZ / picture.reading.span.frames, rel=0.01, abs=0)
    assert "cosine" in picture.window
    # white noise of 10⁻⁶ rms over 48 kHz, per noise bandwidth, to the fundamental's rms; the largest of a column is
    # above the mean, by 10 lg(ln n) for n bins
    rms = 1e-6 * np.sqrt(picture.noise_bandwidth_hz / (RATE_HZ / 2.0)) / (0.5 / np.sqrt(2.0))
    low = picture.spectrum_ratio[(picture.spectrum_hz > 100.0) & (picture.spectrum_hz < 800.0)]
    assert np.sqrt(np.mean(low**2)) == pytest.approx(rms, rel=0.15, abs=0)
    assert np.all(np.diff(picture.spectrum_hz) > 0)
    assert picture.spectrum_hz[-1] <= 20_000.0
    assert picture.spectrum_hz[0] >= 20.0
