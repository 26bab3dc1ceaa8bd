"""Thermal noise, the cable's low-pass and a clamp's distortion, against closed forms and an integrated circuit."""

import math
from typing import Any

import attrs
import numpy as np
import pytest

from tests.dsp.attenuators import bridge_24_v, into_8_ohm
from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_noise import bandwidth_hz, capacitance_f, clamp_distortion, loss, noise


def changed(plan: Plan, **fields: Any) -> Plan:  # noqa: ANN401 - the fields of a value
    return attrs.evolve(plan, wish=attrs.evolve(plan.wish, **fields))


def test_a_kilohm_makes_four_nanovolts_in_a_root_hertz() -> None:
    # √(4kTR) of 1 kΩ at 300 K: 4.0703 nV/√Hz, closed form with the exact k of the SI
    plan = into_8_ohm()
    density = noise(plan).thermal_vrms / math.sqrt(19_980.0) * math.sqrt(1000.0 / plan.leg.node_ohm)
    assert density == pytest.approx(4.0703e-9, rel=1e-4, abs=0)


def test_a_stated_interface_is_not_an_assumed_one() -> None:
    told = noise(changed(into_8_ohm(), interface_noise_vrms=430.9e-9))
    assert not told.interface_is_assumed
    assert told.rise == pytest.approx(math.sqrt(2.0), rel=1e-3, abs=0)  # as much again: 3 dB
    assert noise(into_8_ohm()).interface_is_assumed


def test_the_cable_makes_a_first_order_low_pass() -> None:
    plan = into_8_ohm()
    f = bandwidth_hz(plan)
    assert loss(plan, f) == pytest.approx(math.sqrt(2.0), rel=1e-12, abs=0)
    assert loss(plan, f / 10.0) == pytest.approx(math.sqrt(1.01), rel=1e-12, abs=0)
    assert bandwidth_hz(changed(plan, cable_pf=600.0)) == pytest.approx(f / 2.0, rel=1e-12, abs=0)
    assert math.isinf(bandwidth_hz(changed(plan, cable_pf=0.0)))
    assert loss(changed(plan, cable_pf=0.0), 20e3) == 1.0


def test_a_clamp_loads_the_pin_too() -> None:
    plan = into_8_ohm()
    assert capacitance_f(changed(plan, clamp_pf=50.0)) == pytest.approx(350e-12, rel=1e-12, abs=0)
    assert clamp_distortion(plan, 1e3) is None


def integrated(plan: Plan, frequency_hz: float, clamp_pf: float) -> float:
    """Return the distortion of a sine through R into C0/√(1 + (V + v)/0.7 V), the circuit integrated in time (RK4)."""
    resistance = plan.leg.node_ohm
    pins = 2.0 if plan.wish.bridge_tied else 1.0
    peak = math.sqrt(2.0) * plan.level_vrms / pins
    omega, steps, periods = 2.0 * math.pi * frequency_hz, 16_384, 2

    def slope(t: float, v: float) -> float:
        junction = clamp_pf * 1e-12 / math.sqrt(1.0 + (peak + v) / 0.7)
        return (peak * math.cos(omega * t) - v) / (resistance * junction)

    h, v, wave = 1.0 / frequency_hz / steps, peak, np.zeros(steps)
    for n in range(periods * steps):
        t = n * h
        k1 = slope(t, v)
        k2 = slope(t + h / 2, v + h / 2 * k1)
        k3 = slope(t + h / 2, v + h / 2 * k2)
        k4 = slope(t + h, v + h * k3)
        v += h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
        wave[n % steps] = v
    lines = np.abs(np.fft.rfft(wave))
    return float(np.sqrt((lines[2:10] ** 2).sum()) / lines[1])


@pytest.mark.parametrize("made", [into_8_ohm, bridge_24_v])
def test_a_clamp_s_distortion_is_that_of_the_circuit(made: object) -> None:
    assert callable(made)
    plan: Plan = made()
    pf, frequency_hz = 500.0, 20_000.0  # large, so that RK4 is not stiff: RωC = 0.035
    told = clamp_distortion(changed(plan, clamp_pf=pf), frequency_hz)
    assert told == pytest.approx(integrated(plan, frequency_hz, pf), rel=0.01, abs=0)  # second order in RωC


def test_a_clamp_s_distortion_rises_with_frequency_and_capacitance() -> None:
    plan = changed(into_8_ohm(), clamp_pf=20.0)
    low, high = clamp_distortion(plan, 1e3), clamp_distortion(plan, 20e3)
    twice = clamp_distortion(changed(plan, clamp_pf=40.0), 1e3)
    assert low is not None
    assert high == pytest.approx(20.0 * low, rel=1e-9, abs=0)
    assert twice == pytest.approx(2.0 * low, rel=1e-9, abs=0)
