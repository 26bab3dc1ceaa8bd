"""Noise in a band: an ideal filter with its edges, freedom given back, and what stands beside the band."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import db, read_ok, read_one, sine, value
from wattproof.core.reading import ReadingSettings, Reference, State
from wattproof.core.signal import Capture
from wattproof.dsp.band import band_noise, line_noise, noise_spectrum
from wattproof.procedures.read_recording import read_recording

RATE_HZ = 48_000.0


def _spectrum_of_noise(frames: int, seed: int = 1, spread: float = 1.0) -> np.ndarray:
    return np.random.default_rng(seed).normal(0.0, spread, (1, 1, frames))


def test_the_bins_of_a_spectrum_add_up_to_the_mean_square() -> None:
    noise = _spectrum_of_noise(48_000)
    for frames in (48_000, 47_999):
        spectrum = noise_spectrum(noise[..., :frames], RATE_HZ)
        # the taper weighs the ends less, which leaves 0.5 % of scatter in a mean square of 48 000 values
        assert spectrum.power.sum() == pytest.approx(np.mean(noise**2), rel=0.02, abs=0)


@pytest.mark.parametrize(("low_hz", "high_hz"), [(20.0, 20_000.0), (300.0, 3400.0), (1000.0, 1010.0), (0.0, 24_000.0)])
def test_white_noise_in_a_band_is_its_share(low_hz: float, high_hz: float) -> None:
    readings = [
        band_noise(noise_spectrum(_spectrum_of_noise(24_000, seed), RATE_HZ), 0, low_hz, high_hz, fitted=0.0)
        for seed in range(40)
    ]
    share = (high_hz - low_hz) / (RATE_HZ / 2.0)
    mean = float(np.mean([reading.mean_square for reading in readings]))
    # 40 blocks of 0.5 s: 40·2BT/1.15 degrees of freedom; four times the scatter of their mean
    scatter = math.sqrt(2.0 / (40 * 2.0 * (high_hz - low_hz) * 0.5 / 1.15))
    assert mean == pytest.approx(share, rel=4.0 * scatter + 0.002, abs=0)
    assert readings[0].u / readings[0].mean_square == pytest.approx(scatter * math.sqrt(40), rel=0.35, abs=0)


def test_an_empty_band_holds_no_noise() -> None:
    spectrum = noise_spectrum(_spectrum_of_noise(480), RATE_HZ)
    assert band_noise(spectrum, 0, 110.0, 120.0, fitted=0.0).mean_square == 0.0


@pytest.mark.parametrize("place", [0.0, 1.0, 3.0, 10.0, 100.0, 5000.0, 11_990.0, 12_000.0])
def test_the_noise_on_a_line_is_that_of_its_neighbours(place: float) -> None:
    powers = np.concatenate([noise_spectrum(_spectrum_of_noise(24_000, seed), RATE_HZ).power for seed in range(200)])
    found = line_noise(powers, np.array([place]))
    # closed form: white noise of variance 1 puts 2/N on each bin; the median of 40 scatters by 23 %, 200 of them by 1.6
    # at the ends only half of the bins are there, each twice
    assert found.mean() == pytest.approx(2.0 / 24_000, rel=0.12, abs=0)


def test_a_strong_line_does_not_lift_the_noise_beside_it() -> None:
    powers = np.concatenate([noise_spectrum(_spectrum_of_noise(24_000, seed), RATE_HZ).power for seed in range(100)])
    before = line_noise(powers, np.array([500.0])).mean()
    powers[:, 505:509] = 1e3
    # four of forty bins are taken from the lower or upper half: the median moves by up to 2/40 of the distribution,
    # where an exponential one has the slope 2·mean: 10 % of the mean, 15 % of the median
    assert line_noise(powers, np.array([500.0])).mean() == pytest.approx(before, rel=0.25, abs=0)


@pytest.mark.parametrize("seconds", [0.1, 0.25, 1.0])
@pytest.mark.parametrize(
    ("tone_hz", "inside"), [(6650.0, True), (6666.0, True), (20_000.0 / 3.0, True), (6670.0, False), (6700.0, False)]
)
def test_a_third_harmonic_counts_up_to_20_khz_and_not_beyond(tone_hz: float, inside: bool, seconds: float) -> None:  # noqa: FBT001
    # H3 at 19.95 and 19.998 kHz, just on 20 kHz, at 20.01 and at 20.1 kHz
    third = 1e-4
    noise = np.random.default_rng(8).normal(0.0, 1e-6, round(seconds * RATE_HZ))
    samples = sine(noise.size, RATE_HZ, tone_hz, peak=0.5, harmonics={3: (third, 0.4)}) + noise
    reading = read_ok(samples, RATE_HZ)
    in_band = 1e-6 * math.sqrt(2.0 * 19_980.0 / 24_000.0) / 0.5
    expected = math.hypot(third, in_band) if inside else in_band
    # 0.05 dB beside the edge is asked for; noise alone scatters by 4.34·√(1.15/BT) = 0.1 dB in 0.1 s, twice that
    within = 0.02 if inside else 0.05 + 0.2 * math.sqrt(0.1 / seconds)
    assert db(value(reading.thdn) / expected) == pytest.approx(0.0, rel=0, abs=within)
    assert (3 in {harmonic.order for harmonic in reading.harmonics}) is inside


@pytest.mark.parametrize("low_hz", [99.0, 100.0, 101.0])
def test_the_lower_edge_belongs_to_the_band_too(low_hz: float) -> None:
    samples = sine(48_000, RATE_HZ, 50.0, peak=0.5, harmonics={2: (1e-2, 0.0), 3: (1e-3, 0.0)})
    reading = read_ok(samples, RATE_HZ, fundamental_hz=50.0, low_hz=low_hz, reference=Reference.FUNDAMENTAL)
    expected = math.hypot(1e-2, 1e-3) if low_hz <= 100.0 else 1e-3
    assert value(reading.thd) == pytest.approx(expected, rel=1e-6, abs=0)


@pytest.mark.parametrize("seconds", [0.1, 0.5])
def test_a_drift_of_one_percent_in_a_tenth_of_a_second_does_not_disturb_minus_100_db(seconds: float) -> None:
    frames = round(seconds * RATE_HZ)
    samples = sine(frames, RATE_HZ, 997.0, peak=0.9, harmonics={2: (1e-5, 0.0)})
    t = np.arange(frames) / RATE_HZ
    drift = 0.1 * t  # 1 % of full scale per 0.1 s
    plain, drifting = (read_ok(samples + extra, RATE_HZ) for extra in (np.zeros(frames), drift))
    assert db(value(plain.thdn)) == pytest.approx(-100.0, rel=0, abs=0.01)
    assert db(value(drifting.thdn)) == pytest.approx(-100.0, rel=0, abs=0.1)


def test_a_settling_coupling_capacitor_does_not_disturb_minus_100_db() -> None:
    frames = 12_000
    samples = sine(frames, RATE_HZ, 997.0, peak=0.9, harmonics={2: (1e-5, 0.0)})
    settling = 0.02 * np.exp(-np.arange(frames) / RATE_HZ / 0.5)  # time constant 0.5 s
    assert db(value(read_ok(samples + settling, RATE_HZ).thdn)) == pytest.approx(-100.0, rel=0, abs=0.1)


@pytest.mark.parametrize("mains_hz", [50.0, 49.93, 60.0])
def test_a_line_of_hum_is_told_apart_and_counted_once(mains_hz: float) -> None:
    hum = 0.5 * 10.0 ** (-90.0 / 20.0) * sine(48_000, RATE_HZ, mains_hz, phase_rad=0.3)
    noise = np.random.default_rng(3).normal(0.0, 2e-7, 48_000)
    samples = sine(48_000, RATE_HZ, 997.0, peak=0.5, harmonics={2: (10.0**-4.5, 0.0)}) + hum + noise
    reading = read_ok(samples, RATE_HZ)
    assert db(value(reading.hum)) == pytest.approx(-90.0, rel=0, abs=0.02)
    assert db(value(reading.thd)) == pytest.approx(-90.0, rel=0, abs=0.01)
    assert db(value(reading.thdn)) == pytest.approx(-86.99, rel=0, abs=0.02)
    assert reading.mains.frequency_hz == pytest.approx(mains_hz, rel=1e-4, abs=0)


@pytest.mark.parametrize(("low_hz", "high_hz"), [(20.0, 20_000.0), (300.0, 3400.0), (900.0, 1100.0), (20.0, 22_400.0)])
def test_every_reading_goes_through_the_same_band(low_hz: float, high_hz: float) -> None:
    harmonics = {2: (1e-2, 0.0), 3: (3e-3, 0.0), 21: (1e-3, 0.0)}  # 1994, 2991, 20 937 Hz
    samples = sine(48_000, RATE_HZ, 997.0, peak=0.5, harmonics=harmonics)
    reading = read_ok(samples, RATE_HZ, low_hz=low_hz, high_hz=high_hz, reference=Reference.FUNDAMENTAL)
    inside = [ratio for order, (ratio, _) in harmonics.items() if low_hz <= 997.0 * order <= high_hz]
    if inside:
        assert value(reading.thd) == pytest.approx(math.hypot(*inside), rel=1e-6, abs=0)
    else:
        assert reading.thd is None
    assert value(reading.level_fs) == pytest.approx(0.5 * math.hypot(1.0, *inside), rel=1e-6, abs=0)


def test_a_band_beyond_half_the_rate_is_cut_to_it() -> None:
    capture = Capture(sine(48_000, RATE_HZ, 997.0)[:, None], RATE_HZ)
    (reading,) = read_recording(capture, ReadingSettings(high_hz=80_000.0))
    assert reading.settings.high_hz == RATE_HZ / 2.0


def test_no_harmonic_in_the_band_makes_thd_not_measurable() -> None:
    reading = read_one(sine(44_100, 44_100.0, 19_997.0, peak=0.5), 44_100.0)
    assert reading.state is State.OK
    assert (reading.thd, reading.harmonics) == (None, ())
    assert value(reading.fundamental_fs) == pytest.approx(0.5, rel=1e-6, abs=0)
