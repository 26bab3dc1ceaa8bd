"""Output resistance, damping factor, efficiency and separation against closed forms that a pocket calculator checks."""

import cmath
import math

import numpy as np
import pytest
from scipy.signal import freqs

from wattproof.bench.simulated.extras import high_pass, output_filter, shelf_high, shelf_low
from wattproof.bench.simulated.truth import filtered, output_impedance
from wattproof.core.quantity import Part, Quantity
from wattproof.core.units import db
from wattproof.dsp.energy import energy_balance
from wattproof.dsp.output_impedance import AcrossLoad, damping, two_loads
from wattproof.dsp.output_impedance import output_impedance as read_impedance
from wattproof.dsp.quiet import read_quiet


# Ro = RL·(V0 − VL)/VL and DF = VL/(V0 − VL): Ohm's law
@pytest.mark.parametrize(
    ("loaded_v", "load_ohm", "expected_ohm", "expected_factor"),
    [(9.90, 8.0, 0.080808, 99.0), (9.96, 8.0, 0.032129, 249.0), (9.50, 4.0, 0.210526, 19.0)],
)
def test_unloaded_and_loaded_give_the_divider(
    loaded_v: float, load_ohm: float, expected_ohm: float, expected_factor: float
) -> None:
    z = two_loads(10.0, loaded_v, math.inf, load_ohm)
    assert z.real == pytest.approx(expected_ohm, rel=0.0, abs=6e-7)  # six decimals
    assert load_ohm / z.real == pytest.approx(expected_factor, rel=1e-9, abs=0.0)


def test_two_loads_give_the_source_behind_them() -> None:
    # 10.00 V across 8 Ω and 9.90 V across 4 Ω: Ro = 0.081633 Ω (Thévenin, by hand)
    assert two_loads(10.0, 9.9, 8.0, 4.0).real == pytest.approx(0.081633, rel=1e-5, abs=0.0)


def test_a_reactance_is_seen_by_phase_and_not_by_level() -> None:
    # j0.08 Ω before 8 Ω moves the level by 50 ppm: 1/|1 + j0.01| (by hand)
    loaded = 8.0 / (8.0 + 0.08j)
    assert 1.0 - abs(loaded) == pytest.approx(50e-6, rel=0.01, abs=0.0)
    assert two_loads(1.0, loaded, math.inf, 8.0) == pytest.approx(0.08j, rel=1e-9, abs=1e-12)


def test_a_hundredth_of_a_decibel_is_a_tenth_of_a_damping_factor_of_100() -> None:
    # relative error of DF is (DF + 1) times that of V0/VL: 0.01 dB is 0.115 %, so 11.6 % at 100 (by hand)
    volts = 100.0 / 101.0
    factor = 8.0 / two_loads(1.0, volts, math.inf, 8.0).real
    moved = 8.0 / two_loads(10.0 ** (0.01 / 20.0), volts, math.inf, 8.0).real
    assert factor == pytest.approx(100.0, rel=1e-9, abs=0.0)
    assert factor / moved - 1.0 == pytest.approx(0.1164, rel=1e-3, abs=0.0)


def test_a_damping_factor_that_cannot_be_told_is_greater_than() -> None:
    doubtful = Quantity(0.01, "Ω", (Part("repeatability", 0.02),))
    assert damping(8.0, doubtful).high is None
    assert damping(8.0, doubtful).words == f"greater than {8.0 / (0.01 + 1.959964 * 0.02):.2g}"
    sure = damping(8.0, Quantity(0.08, "Ω", (Part("repeatability", 0.004),)))
    assert (sure.low, sure.high) == pytest.approx((8.0 / 0.08784, 8.0 / 0.07216), rel=1e-4, abs=0.0)


def test_a_load_that_is_off_moves_the_output_resistance_as_the_budget_says() -> None:
    # the load known to 0.1 %: compared with the same voltages reckoned for a load 0.1 % higher
    ohm = Quantity(8.0, "Ω", (Part("load", 0.008),))
    found = read_impedance(AcrossLoad(ohm, 10.0, 0.0), AcrossLoad(Quantity(4.0, "Ω"), 9.9, 0.0), 0.0)
    moved = two_loads(10.0, 9.9, 8.008, 4.0) - two_loads(10.0, 9.9, 8.0, 4.0)
    assert found.resistance.u == pytest.approx(abs(moved), rel=0.02, abs=0.0)


def test_ten_watts_at_70_per_cent_leave_4_3_watts_of_heat() -> None:
    balance = energy_balance(Quantity(10.0, "W"), Quantity(10.0 / 0.7, "W"))
    assert balance.efficiency.value == pytest.approx(0.7, rel=1e-12, abs=0.0)
    assert balance.heat_w.value == pytest.approx(30.0 / 7.0, rel=1e-12, abs=0.0)  # 10/0.7 − 10: 4.2857 W


def test_two_channels_of_50_watts_from_160_are_62_and_a_half_per_cent() -> None:
    balance = energy_balance(Quantity(100.0, "W"), Quantity(160.0, "W"))
    assert balance.efficiency.value == pytest.approx(0.625, rel=1e-12, abs=0.0)


@pytest.mark.parametrize("hz", [20.0, 150.0, 997.0, 4_000.0, 20_000.0])
@pytest.mark.parametrize(
    "prototype", [shelf_low(9.0, 150.0), shelf_high(-6.0, 4_000.0), high_pass(20.0), output_filter(8.0, 0.08)]
)
def test_the_simulated_filters_are_those_of_a_general_library(
    prototype: tuple[tuple[float, ...], tuple[float, ...]], hz: float
) -> None:
    # scipy.signal.freqs at the frequency that the bilinear transform at 768 kHz maps to hz: (fs/π)·tan(π·hz/fs)
    raised_hz = 768_000.0
    _, gain = freqs(*prototype, [2.0 * raised_hz * math.tan(math.pi * hz / raised_hz)])
    assert filtered((prototype,), hz) == pytest.approx(complex(gain[0]), rel=1e-9, abs=1e-12)


def test_a_shelf_has_half_its_decibels_at_its_corner() -> None:
    # |s + ω√G|/|s + ω/√G| at s = jω is √((1 + G)/(1 + 1/G)) = √G (by hand)
    assert db(abs(filtered((shelf_low(12.0, 150.0),), 150.0))) == pytest.approx(6.0, rel=0.0, abs=1e-3)


def test_the_output_filters_impedance_is_coil_and_capacitor_in_parallel() -> None:
    # nearly its resistance at the bottom, and at 20 kHz jωL/(1 − ω²LC) with L = 20 µH, C = 0.68 µF (by hand)
    assert output_impedance(0.08, 10.0) == pytest.approx(0.08 + 0.001257j, rel=0.0, abs=1e-5)
    omega = 2.0 * math.pi * 20_000.0
    ideal = 1j * omega * 20e-6 / (1.0 - omega**2 * 20e-6 * 0.68e-6)
    assert abs(output_impedance(0.0, 20_000.0) / ideal - 1.0) < 0.005  # what the bilinear transform bends
    assert math.degrees(cmath.phase(output_impedance(0.0, 20_000.0))) == pytest.approx(90.0, rel=0.0, abs=1e-6)


def test_the_thermal_noise_of_a_resistor_is_read_as_its_formula_says() -> None:
    # √(4kTR) at 290 K: 10 kΩ has 12.6552 nV/√Hz and 1.78972 µV in 20 kHz (k = 1.380649e-23 J/K, exact), here with
    # 1 µV as full scale of a sine, so a mean square of ½
    density_v = math.sqrt(4.0 * 1.380649e-23 * 290.0 * 10e3)
    sigma = density_v * math.sqrt(48_000.0) / (1e-6 * math.sqrt(2.0))
    samples = sigma * np.random.default_rng(11).standard_normal((round(4.0 * 96_000.0), 1))
    quiet = read_quiet(samples, 96_000.0, (20.0, 20_000.0))[0]
    width = math.sqrt(19_980.0 / 20_000.0)
    # 160 000 degrees of freedom: 0.18 % each, and the density's median of 4 000 bins 1.1 %
    assert 1e-6 * quiet.noise.value == pytest.approx(1.78972e-6 * width, rel=6e-3, abs=0.0)
    near = [value for hz, value in quiet.density if 9_000.0 < hz < 11_000.0]
    assert 1e-6 * float(np.mean(near)) == pytest.approx(12.6552e-9, rel=0.03, abs=0.0)
