"""Distortion of ideal waveforms against their Fourier series and their closed sums."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import read_ok, sine, value
from tests.outside.closed_forms import (
    ALL_HARMONICS,
    Series,
    full_wave,
    half_wave,
    harmonics,
    pulse,
    sawtooth,
    square,
    thd_f,
    to_total,
    triangle,
)
from wattproof.core.reading import Reference

RATE_HZ = 96_000.0
WAVES = {
    "square": (square, False),
    "triangle": (triangle, False),
    "sawtooth": (sawtooth, False),
    "half-wave": (half_wave, None),
    "full-wave": (full_wave, True),
}
# A fit that ends below −250 dB leaves nothing visible here; 10⁻⁹ covers the sum of twenty squares in float64.
RTOL = 1e-9


def _wave(series: Series, frequency_hz: float, highest: int, *, cosine: bool = False) -> np.ndarray:
    return sine(
        24_000, RATE_HZ, frequency_hz, peak=0.4, phase_rad=1.1, harmonics=harmonics(series, highest, cosine=cosine)
    )


@pytest.mark.parametrize("name", WAVES)
def test_a_wave_of_997_hz_reads_the_sum_of_its_series_up_to_20_khz(name: str) -> None:
    series, cosine = WAVES[name]
    samples = _wave(series, 997.0, 40, cosine=bool(cosine))  # harmonics up to 39.9 kHz: beyond 20 kHz none may count
    to_fundamental = read_ok(samples, RATE_HZ, reference=Reference.FUNDAMENTAL)
    total = read_ok(samples, RATE_HZ)
    expected = thd_f(series, 20)  # Fourier series, closed form
    assert value(to_fundamental.thd) == pytest.approx(expected, rel=RTOL, abs=0)
    assert value(total.thd) == pytest.approx(to_total(expected), rel=RTOL, abs=0)  # definition: r/√(1 + r²)
    assert value(total.thdn) == pytest.approx(to_total(expected), rel=RTOL, abs=0)


@pytest.mark.parametrize(
    ("name", "percent"),
    [("square", 45.686_03), ("sawtooth", 77.211_61), ("triangle", 12.106_73)],
)
def test_the_band_limited_figures_are_those_of_a_pocket_calculator(name: str, percent: float) -> None:
    # closed form: 100·√Σ(bk/b1)², k = 2…20, e.g. the square's √(1/9 + 1/25 + … + 1/361)
    reading = read_ok(_wave(WAVES[name][0], 997.0, 40), RATE_HZ, reference=Reference.FUNDAMENTAL)
    assert 100.0 * value(reading.thd) == pytest.approx(percent, rel=0, abs=6e-6)  # half of the last digit and a bit


@pytest.mark.parametrize(("highest", "percent"), [(3, 33.333_33), (5, 38.873_01), (7, 41.414_89), (9, 42.879_48)])
def test_a_square_wave_counts_just_the_harmonics_that_its_band_holds(highest: int, percent: float) -> None:
    reading = read_ok(
        _wave(square, 997.0, 40), RATE_HZ, reference=Reference.FUNDAMENTAL, high_hz=997.0 * highest
    )  # the edge itself belongs to the band
    assert 100.0 * value(reading.thd) == pytest.approx(percent, rel=0, abs=6e-6)  # closed form, as above


@pytest.mark.parametrize("name", WAVES)
def test_with_every_harmonic_in_the_band_the_closed_sum_is_reached(name: str) -> None:
    series, cosine = WAVES[name]
    highest = 190  # 101 Hz up to 19.2 kHz; the rest of the closed sum, k > 190, is never played
    reading = read_ok(_wave(series, 101.0, highest, cosine=bool(cosine)), RATE_HZ, reference=Reference.FUNDAMENTAL)
    rest = ALL_HARMONICS[name] ** 2 - thd_f(series, highest) ** 2
    assert rest > 0.0
    # closed forms: π²/8 − 1, π⁴/96 − 1, π²/6 − 1, 1 − 8/π², 9π²/16 − 11/2
    assert value(reading.thd) ** 2 + rest == pytest.approx(ALL_HARMONICS[name] ** 2, rel=RTOL, abs=0)


@pytest.mark.parametrize(("duty", "percent"), [(0.4, 55.622_65), (0.25, 92.225_31), (0.1, 191.076)])
def test_a_rectangular_pulse_reads_its_series(duty: float, percent: float) -> None:
    series = pulse(duty)
    reading = read_ok(_wave(series, 101.0, 190, cosine=True), RATE_HZ, reference=Reference.FUNDAMENTAL)
    assert value(reading.thd) == pytest.approx(thd_f(series, 190), rel=RTOL, abs=0)
    closed = math.sqrt(math.pi**2 * duty * (1 - duty) / (2 * math.sin(math.pi * duty) ** 2) - 1)
    assert 100.0 * closed == pytest.approx(percent, rel=0, abs=6e-4)  # closed form over all harmonics (Parseval)
    rest = closed**2 - thd_f(series, 4000) ** 2  # the sum truly goes there
    assert rest / closed**2 == pytest.approx(0.0, rel=0, abs=1e-3)


def test_the_crest_factor_of_a_clean_sine_is_the_root_of_two() -> None:
    # closed form; 0.4·RATE/997 samples a cycle leave the peak at most 1 − cos(π·997/96000) = 0.05 % low
    reading = read_ok(sine(96_000, RATE_HZ, 997.0, peak=0.5), RATE_HZ)
    assert value(reading.crest_factor) == pytest.approx(math.sqrt(2.0), rel=6e-4, abs=0)
