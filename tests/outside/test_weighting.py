"""A-weighting, the BS.468-4 network and its quasi-peak meter against the tables of their standards."""

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose

from wattproof.core.signal import Samples
from wattproof.dsp.band import noise_spectrum
from wattproof.dsp.fit import block_of
from wattproof.dsp.quasi_peak import highest, indicated
from wattproof.dsp.weighting import a_poles_hz, a_weight, itu_weight, itu_weighted, weighted_square

# IEC 61672-1:2013, table 3 (A), in dB, at the exact frequencies 1000·10^(n/10), n = −20…13.
A_TABLE_DB = (
    -70.4, -63.4, -56.7, -50.5, -44.7, -39.4, -34.6, -30.2, -26.2, -22.5, -19.1, -16.1, -13.4, -10.9, -8.6, -6.6, -4.8,
    -3.2, -1.9, -0.8, 0.0, 0.6, 1.0, 1.2, 1.3, 1.2, 1.0, 0.5, -0.1, -1.1, -2.5, -4.3, -6.6, -9.3,
)  # fmt: skip
# Recommendation ITU-R BS.468-4, table 1: frequency in Hz, response in dB.
ITU_TABLE = (
    (31.5, -29.9), (63.0, -23.9), (100.0, -19.8), (200.0, -13.8), (400.0, -7.8), (800.0, -1.9), (1_000.0, 0.0),
    (2_000.0, 5.6), (3_150.0, 9.0), (4_000.0, 10.5), (5_000.0, 11.7), (6_300.0, 12.2), (7_100.0, 12.0), (8_000.0, 11.4),
    (9_000.0, 10.1), (10_000.0, 8.1), (12_500.0, 0.0), (14_000.0, -5.3), (16_000.0, -11.7), (20_000.0, -22.2),
    (31_500.0, -42.7),
)  # fmt: skip
RATE_HZ = 96_000.0


def in_db(ratio: Samples) -> Samples:
    return np.asarray(20.0 * np.log10(ratio), dtype=np.float64)


def test_the_a_curve_meets_the_table_to_its_rounding() -> None:
    exact_hz = 1000.0 * 10.0 ** (np.arange(-20, 14) / 10.0)
    assert_allclose(in_db(a_weight(exact_hz)), A_TABLE_DB, rtol=0.0, atol=0.0501)  # the table has one decimal


def test_the_poles_of_the_a_curve_round_to_those_of_the_standard() -> None:
    # IEC 61672-1:2013, annex E prints 20.60, 107.7, 737.9 and 12 194 Hz
    f1, f2, f3, f4 = a_poles_hz()
    assert (round(f1, 2), round(f2, 1), round(f3, 1), round(f4)) == (20.60, 107.7, 737.9, 12_194)


def test_the_bs468_network_meets_the_table_to_its_rounding() -> None:
    hz, expected_db = (np.array(column) for column in zip(*ITU_TABLE, strict=True))
    assert_allclose(in_db(itu_weight(hz)), expected_db, rtol=0.0, atol=0.051)  # one decimal; 0.050 dB is the worst


def test_white_noise_under_a_is_lower_by_the_closed_form() -> None:
    # the integral of the closed form over 20 Hz to 20 kHz: −2.048 dB, computed with a general library (mpmath)
    samples = np.random.default_rng(7).standard_normal((round(8.0 * RATE_HZ), 1))
    spectrum = noise_spectrum(block_of(samples), RATE_HZ)
    bins = np.arange(spectrum.power.shape[1], dtype=np.float64) * spectrum.bin_hz
    plain = weighted_square(spectrum, 0, np.ones(bins.size), 20.0, 20_000.0)
    a = weighted_square(spectrum, 0, a_weight(bins), 20.0, 20_000.0)
    # 160 000 and more degrees of freedom: 0.02 dB is four standard deviations
    assert 10.0 * math.log10(a.mean_square / plain.mean_square) == pytest.approx(-2.048, rel=0.0, abs=0.02)


def burst(milliseconds: float) -> Samples:
    """Return a burst of 5 kHz of peak 1 with room for the needle behind it."""
    frames = round(milliseconds * 1e-3 * RATE_HZ)
    samples = np.zeros(frames + round(0.06 * RATE_HZ))
    samples[:frames] = np.sin(2.0 * np.pi * 5_000.0 / RATE_HZ * np.arange(frames))
    return samples


def shown_percent(samples: Samples) -> float:
    steady = indicated(itu_weighted(burst(2_000.0), RATE_HZ), RATE_HZ).mean
    return 100.0 * highest(itu_weighted(samples, RATE_HZ), RATE_HZ) / steady


# Recommendation ITU-R BS.468-4, 2.1: single bursts of 5 kHz, reading and its limits in % of the steady tone (from
# memory of the table; not read on this project).
@pytest.mark.parametrize(
    ("milliseconds", "low", "high"),
    [
        (1.0, 13.4, 21.4),
        (2.0, 22.4, 31.6),
        (5.0, 34.0, 46.0),
        (10.0, 41.0, 55.0),
        (20.0, 44.0, 60.0),
        (50.0, 50.0, 68.0),
        (100.0, 58.0, 78.0),
        (200.0, 68.0, 92.0),
    ],
)
def test_single_bursts_are_shown_within_their_limits(milliseconds: float, low: float, high: float) -> None:
    assert low <= shown_percent(burst(milliseconds)) <= high


# Likewise 2.2: bursts of 5 ms, repeated so often in a second.
@pytest.mark.parametrize(("a_second", "low", "high"), [(2, 43.0, 53.0), (10, 72.0, 82.0), (100, 94.0, 100.0)])
def test_repeated_bursts_are_shown_within_their_limits(a_second: int, low: float, high: float) -> None:
    one = np.zeros(round(RATE_HZ / a_second))
    one[: round(5e-3 * RATE_HZ)] = burst(5.0)[: round(5e-3 * RATE_HZ)]
    repeated = np.tile(one, round(1.5 * a_second))
    assert low <= shown_percent(repeated) <= high


def test_a_steady_kilohertz_is_shown_as_its_rms() -> None:
    # ITU-R BS.468-4, 2.5: 0.775 V of 1 kHz reads 0.775 V
    at_s = np.arange(round(2.0 * RATE_HZ)) / RATE_HZ
    samples = 0.775 * np.sqrt(2.0) * np.sin(2.0 * np.pi * 1_000.0 * at_s)
    assert indicated(itu_weighted(samples, RATE_HZ), RATE_HZ).mean == pytest.approx(0.775, rel=2e-3, abs=0.0)
