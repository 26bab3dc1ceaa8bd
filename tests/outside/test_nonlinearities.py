"""Clipped sines, crossover dead zones and polynomials: harmonics with phase, totals and crest factor."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import read_ok, sine, value
from tests.outside.closed_forms import Series, clipped, dead_zone, harmonics, thd_f, to_total
from wattproof.core.reading import Reading, Reference
from wattproof.core.signal import Samples

RATE_HZ = 192_000.0
TONE_HZ = 997.0
RTOL = 1e-9  # the fit leaves less than 10⁻¹², the rest is float64

# closed form (integration of A·sin x up to the clipping angle θ and of 1 beyond it): θ in degrees, then h3, h5, h7 as
# signed percent of the fundamental and THD to the fundamental in percent, harmonics up to the 20th
CLIPPED = [
    (85, 0.027_999, -0.027_659, 0.027_154, 0.075_963),
    (80, 0.219_344, -0.208_762, 0.193_572, 0.469_209),
    (75, 0.716_137, -0.639_381, 0.535_266, 1.226_598),
    (70, 1.624_23, -1.320_24, 0.940_439, 2.382_265),
    (65, 3.005_42, -2.146_56, 1.186_98, 3.919_456),
    (60, 4.875_58, -2.925_35, 1.044_77, 5.822_737),
    (50, 9.935_98, -3.367_49, -0.669_659, 10.598_88),
    (45, 12.966_2, -2.593_23, -1.852_31, 13.414_94),
    (30, 22.632_6, 4.526_53, -1.616_62, 23.285_34),
    (10, 31.998_6, 17.655_4, 11.056_7, 39.212_15),
]
# closed form, likewise: dead zone to peak, h3, h5 in signed percent
DEAD_ZONES = [
    (0.001, -0.042_495, -0.025_497),
    (0.01, -0.429_822, -0.257_824),
    (0.05, -2.257_79, -1.345_64),
    (0.1, -4.789_42, -2.797_02),
    (0.2, -10.687_4, -5.728_42),
    (0.5, -35.251, -7.050_2),
]


def _played(series: Series, highest: int, peak: float = 0.3, *, cosine: bool = False) -> Samples:
    partials = harmonics(series, highest, cosine=cosine)
    return sine(48_000, RATE_HZ, TONE_HZ, peak=peak, phase_rad=0.4, harmonics=partials)


def _signed_percent(reading: Reading, order: int) -> float:
    """Return a harmonic whose phase must be 0 or π, as signed percent of the fundamental."""
    found = next(harmonic for harmonic in reading.harmonics if harmonic.order == order)
    assert min(abs(found.phase_rad), abs(abs(found.phase_rad) - math.pi)) < 1e-6
    return 100.0 * found.ratio.value * (1.0 if abs(found.phase_rad) < 1.0 else -1.0)


@pytest.mark.parametrize(("theta", "h3", "h5", "h7", "thd"), CLIPPED)
def test_a_clipped_sine_reads_its_series(theta: float, h3: float, h5: float, h7: float, thd: float) -> None:
    series = clipped(theta)
    samples = _played(series, 40)
    reading = read_ok(samples, RATE_HZ, reference=Reference.FUNDAMENTAL)
    for order, percent in ((3, h3), (5, h5), (7, h7)):
        assert _signed_percent(reading, order) == pytest.approx(percent, rel=1e-5, abs=1e-6)  # digits of the table
        exact = 100.0 * float(series(order) / series(1))
        assert _signed_percent(reading, order) == pytest.approx(exact, rel=RTOL, abs=1e-9)
    assert 100.0 * value(reading.thd) == pytest.approx(thd, rel=1e-5, abs=1e-6)
    assert value(reading.thd) == pytest.approx(thd_f(series, 20), rel=RTOL, abs=0)
    total = read_ok(samples, RATE_HZ)
    assert value(total.thd) == pytest.approx(to_total(thd_f(series, 20)), rel=RTOL, abs=0)


@pytest.mark.parametrize("theta", [85, 75, 60, 45, 30])
def test_a_clipped_sine_has_the_crest_factor_of_its_mean_square(theta: float) -> None:
    # closed form: peak 1, mean square (2/π)(A²(θ/2 − sin 2θ/4) + π/2 − θ), A = 1/sin θ
    angle, height = math.radians(theta), 1.0 / math.sin(math.radians(theta))
    square = 2.0 / math.pi * (height**2 * (angle / 2 - math.sin(2 * angle) / 4) + math.pi / 2 - angle)
    n = np.arange(48_000)
    samples = 0.5 * np.clip(height * np.sin(2 * np.pi * TONE_HZ / RATE_HZ * n), -1.0, 1.0)  # in time: its top is flat
    reading = read_ok(samples, RATE_HZ)
    assert value(reading.crest_factor) == pytest.approx(1.0 / math.sqrt(square), rel=1e-3, abs=0)  # 1 % of a cycle off


@pytest.mark.parametrize(("width", "h3", "h5"), DEAD_ZONES)
def test_a_crossover_dead_zone_reads_its_series(width: float, h3: float, h5: float) -> None:
    series = dead_zone(width)
    reading = read_ok(_played(series, 20), RATE_HZ, reference=Reference.FUNDAMENTAL)
    assert _signed_percent(reading, 3) == pytest.approx(h3, rel=2e-5, abs=1e-6)  # digits of the table
    assert _signed_percent(reading, 5) == pytest.approx(h5, rel=2e-5, abs=1e-6)
    assert value(reading.thd) == pytest.approx(thd_f(series, 20), rel=RTOL, abs=0)


@pytest.mark.parametrize(
    ("peak", "a2", "a3", "percent"),
    [
        (1.0, 0.01, 0.0, 0.5),
        (1.0, 0.0, 0.01, 0.248_139),
        (1.0, 0.01, 0.01, 0.554_856),
        (1.0, 0.01, -0.01, 0.563_241),
        (1.0, 0.1, -0.05, 5.354_683),
        (2.0, 0.01, 0.01, 1.373_023),
    ],
)
def test_a_polynomial_reads_what_trigonometry_says(peak: float, a2: float, a3: float, percent: float) -> None:
    # closed form, y = x + a2·x² + a3·x³ of x = A·cos: H1 = A + ¾a3A³, H2 = a2A²/2, H3 = a3A³/4, DC = a2A²/2
    x = peak * sine(48_000, RATE_HZ, TONE_HZ, phase_rad=math.pi / 2)
    reading = read_ok(x + a2 * x**2 + a3 * x**3, RATE_HZ, reference=Reference.FUNDAMENTAL)
    first, second, third = peak + 0.75 * a3 * peak**3, a2 * peak**2 / 2, a3 * peak**3 / 4
    assert value(reading.fundamental_fs) == pytest.approx(first, rel=RTOL, abs=0)
    assert value(reading.dc_fs) == pytest.approx(second, rel=RTOL, abs=1e-12)
    assert 100.0 * value(reading.thd) == pytest.approx(percent, rel=0, abs=6e-7)
    assert value(reading.thd) == pytest.approx(math.hypot(second, third) / first, rel=RTOL, abs=0)
    by_order = {harmonic.order: harmonic for harmonic in reading.harmonics}
    if a2 > 0:  # cos 2x = sin(2θ − π/2) at θ = x + π/2, so φ2 = −π/2
        assert by_order[2].phase_rad == pytest.approx(-math.pi / 2, rel=0, abs=1e-6)
    if a3 != 0:  # cos 3x = sin(3θ − π): φ3 = ±π where a3 > 0, 0 where a3 < 0
        assert abs(by_order[3].phase_rad) == pytest.approx(math.pi if a3 > 0 else 0.0, rel=0, abs=1e-6)
