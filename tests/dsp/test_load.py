"""The load: four-wire resistance, what lies between cold and hot, and the power beside an inductance."""

import math

import pytest

from wattproof.core.quantity import Quantity
from wattproof.core.rig import Load
from wattproof.dsp.load import four_wire, power, resistance
from wattproof.dsp.uncertainty import known


def test_four_wire_is_ohms_law_with_both_doubts() -> None:
    ohm = four_wire(known(2.012, "V", "voltmeter", 0.002), known(0.2510, "A", "ammeter", 0.0005))
    assert ohm.value == pytest.approx(8.015936, rel=1e-7, abs=0.0)  # 2.012/0.251 by hand
    # GUM 5.1.2: relative 0.000994 and 0.001992 add as squares to 0.002226
    assert ohm.u / ohm.value == pytest.approx(0.0022263, rel=1e-3, abs=0.0)


def test_a_tenth_of_an_ohm_is_two_and_a_half_per_cent_at_four_ohm() -> None:
    volts = Quantity(10.0, "V")
    by_handheld = power(volts, Load(4.0, measured_ohm=4.1, accuracy=0.0), "left", 997.0).value
    truly = power(volts, Load(4.0, measured_ohm=4.0, accuracy=0.0), "left", 997.0).value
    assert truly / by_handheld - 1.0 == pytest.approx(0.025, rel=1e-9, abs=0.0)  # closed form: 0.1/4


def test_a_nominal_load_has_its_tolerance_and_a_measured_one_its_meters_limits() -> None:
    nominal = resistance(Load(8.0), "left")
    assert nominal.value == 8.0
    assert nominal.u == pytest.approx(0.4 / math.sqrt(3.0), rel=1e-12, abs=0.0)  # GUM 4.3.7
    measured = resistance(Load(8.0, measured_ohm=8.05, accuracy=0.002), "left")
    assert measured.u == pytest.approx(8.05 * 0.002 / math.sqrt(3.0), rel=1e-12, abs=0.0)


def test_warming_is_told_by_a_hot_measurement_or_by_the_coefficient() -> None:
    measured = resistance(Load(8.0, measured_ohm=8.0, hot_ohm=8.08, accuracy=0.0), "left")
    told = resistance(Load(8.0, measured_ohm=8.0, temperature_per_k=100e-6, rise_k=100.0, accuracy=0.0), "left")
    for quantity in (measured, told):
        assert quantity.value == pytest.approx(8.04, rel=1e-12, abs=0.0)
        assert quantity.u == pytest.approx(0.04 / math.sqrt(3.0), rel=1e-9, abs=0.0)
    # 1/(1 + TCR·ΔT) − 1 for 100 ppm/K and 100 K: −0.990 % of power (closed form)
    cold = power(Quantity(10.0, "V"), Load(8.0, measured_ohm=8.0, accuracy=0.0), "left", 997.0).value
    hot = power(Quantity(10.0, "V"), Load(8.0, measured_ohm=8.08, accuracy=0.0), "left", 997.0).value
    assert hot / cold - 1.0 == pytest.approx(-0.0099010, rel=1e-4, abs=0.0)


def test_an_inductance_counts_above_two_kilohertz_only() -> None:
    load = Load(8.0, measured_ohm=8.0, accuracy=0.0, inductance_h=20e-6)
    low, high = (power(Quantity(20.0, "V"), load, "left", hz).value for hz in (1_900.0, 20_000.0))
    assert low == pytest.approx(50.0, rel=1e-12, abs=0.0)
    reactance = 2.0 * math.pi * 20_000.0 * 20e-6
    assert high == pytest.approx(400.0 * 8.0 / (64.0 + reactance**2), rel=1e-12, abs=0.0)  # V²·R/|Z|²


def test_the_power_example_by_hand() -> None:
    # V = 20.00 V (u 0.04), R = 8.00 Ω (u 0.08): P = 50.000 W, u = 0.53852 W (GUM 5.1.2, by hand)
    load = Load(8.0, measured_ohm=8.0, accuracy=0.08 * math.sqrt(3.0) / 8.0)
    watts = power(known(20.0, "V", "meter", 0.04), load, "left", 997.0)
    assert watts.value == pytest.approx(50.0, rel=1e-12, abs=0.0)
    assert watts.u == pytest.approx(0.53852, rel=1e-4, abs=0.0)
