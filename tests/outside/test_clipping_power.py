"""Power against clipping, held to closed forms: what curve and onset find on an ideal clipper, and the units."""

import math

import numpy as np
import pytest

from tests.dsp.clippers import GEOMETRIC_VRMS, curve_through, hard, read_at
from tests.outside.closed_forms import clipped, thd_f
from wattproof.core.units import ZERO_DBU_VRMS, db, from_db, power_w
from wattproof.dsp.onset import Onset, find_onset
from wattproof.dsp.power_curve import Point, crossing_of


def power_over_onset(thdn: float) -> float:
    """Total power at a THD (to the fundamental, all harmonics) over that at the onset: hard clipping, stiff supply.

    Mean square of a sine of peak A = 1/sin θ clipped at ±1, by integration over a quarter period:
    (2/π)·[A²(θ/2 − sin 2θ/4) + π/2 − θ]; THD from it and the fundamental (2A/π)(θ + sin θ cos θ) by Parseval.
    """
    low, high = 0.5, 1.57
    for _ in range(60):
        theta = 0.5 * (low + high)
        height = 1.0 / math.sin(theta)
        square = 2.0 / math.pi * (height**2 * (theta / 2 - math.sin(2 * theta) / 4) + math.pi / 2 - theta)
        first = 2.0 * height / math.pi * (theta + math.sin(theta) * math.cos(theta))
        low, high = (theta, high) if math.sqrt(max(2 * square / first**2 - 1, 0.0)) > thdn else (low, theta)
    return 2.0 * square


@pytest.mark.parametrize(
    ("thdn", "times"),
    # closed form, hard-clipped sine: 1.0475 times the onset's power at 1 %, 1.288 times at 10 %; in practice some 1.2
    # and up to 1.8, since supplies sag and recover: common practice, no source
    [(0.01, 1.0475), (0.10, 1.288)],
)
def test_the_power_of_an_ideal_clipper_is_the_closed_form(thdn: float, times: float) -> None:
    assert power_over_onset(thdn) == pytest.approx(times, rel=3e-4, abs=0.0)  # to the digits stated


@pytest.mark.parametrize("thdn", [0.01, 0.10])
def test_the_curve_finds_that_power(thdn: float) -> None:
    drives = 10.0 ** (np.arange(-3.0, 4.0, 0.1) / 20.0)
    read = [read_at(hard, float(drive)) for drive in drives]
    points = [Point(volts, ratio, 1e-6, ratio, 0.0, 0.0, 0.0, 1.0) for volts, ratio in read if ratio > 1e-9]
    # THD+N to the total, as IEC 60268-3 has it: r / √(1 + r²) of the ratio to the fundamental
    crossing = crossing_of(points, thdn / math.sqrt(1.0 + thdn**2))
    assert crossing is not None
    found = (crossing.voltage_vrms / GEOMETRIC_VRMS) ** 2
    # 20 kHz leave out what lies above the 20th harmonic: 0.0008 dB at 1 % (check: the series to 20 and to 4000)
    assert found == pytest.approx(power_over_onset(thdn), rel=1e-3, abs=0.0)


def test_the_onset_stands_at_the_closed_form_of_geometric_clipping() -> None:
    onset = find_onset(curve_through(hard, step_db=0.05, noise_vrms=1e-5))
    assert isinstance(onset, Onset)
    assert onset.voltage_vrms == pytest.approx(1.0 / math.sqrt(2.0), rel=0.0, abs=0.01)
    assert -0.03 < db(onset.voltage_vrms * math.sqrt(2.0)) < 0.10  # a sine of peak 1 is 1/√2 V rms


@pytest.mark.parametrize("theta_deg", [85.0, 76.285, 60.0, 45.0])
def test_thd_against_clipping_angle_is_the_series(theta_deg: float) -> None:
    height = 1.0 / math.sin(math.radians(theta_deg))
    _, ratio = read_at(hard, height)
    expected = thd_f(clipped(theta_deg), 20)
    # a period of 8192 samples: its clipped edges alias below 1e-5
    assert ratio / math.sqrt(1.0 - ratio**2) == pytest.approx(expected, rel=2e-3, abs=1e-5)


def test_units_of_the_trade() -> None:
    assert pytest.approx(math.sqrt(0.6), rel=1e-15, abs=0.0) == ZERO_DBU_VRMS  # 1 mW in 600 Ω: √(0.001·600) V
    assert power_w(6.5, 8.0) == pytest.approx(5.28, rel=1e-3, abs=0.0)  # V²/R = 42.25/8 = 5.28125 W
    assert power_w(6.0, 4.0) == pytest.approx(9.0, rel=1e-15, abs=0.0)  # 36/4
    assert from_db(14.6) ** 2 == pytest.approx(28.8, rel=2e-3, abs=0.0)  # 10^1.46 = 28.84


def test_the_series_beyond_the_band_counts_little() -> None:
    assert thd_f(clipped(60.0), 400) == pytest.approx(0.05826248, rel=1e-4, abs=0.0)  # closed form, all harmonics
    assert thd_f(clipped(60.0), 20) == pytest.approx(0.05822737, rel=1e-5, abs=0.0)  # the same series to n = 20
