"""Three planned attenuators recomputed by hand: each figure by a formula of a line, on a pocket calculator.

Nothing of the planner is used for the expected figures but the four resistor values that it chose.
"""

import math

import pytest

from tests.dsp.attenuators import bridge_24_v, into_4_ohm, into_8_ohm
from wattproof.core.units import db
from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_bridge import common_mode, rejection
from wattproof.dsp.attenuator_faults import faults
from wattproof.dsp.attenuator_leg import Kind
from wattproof.dsp.attenuator_noise import bandwidth_hz, noise

DIGITS = 5.1e-4  # figures below are given to four digits


def near(value: float) -> object:
    return pytest.approx(value, rel=DIGITS, abs=0)


@pytest.mark.parametrize(("planned", "volts"), [(into_8_ohm, 28.284), (into_4_ohm, 20.0)])
def test_single_ended_100_w(planned: object, volts: float) -> None:
    assert callable(planned)
    plan: Plan = planned()
    assert plan.leg.upper_ohm == (4640.0, 4640.0)
    assert plan.leg.lower_ohm == (1270.0, 1270.0)
    # R1 = 9280; R2 = 635; R2 ∥ 10 k = 635·10000/10635 = 597.09; ratio 1 + 9280/597.09 = 16.542
    assert plan.leg.loaded_ohm == near(597.09)
    assert plan.leg.ratio == near(16.542)
    # worst: R1 +1 %, R2 −1 %, input −20 %: 628.65 ∥ 8000 = 582.85, 1 + 9372.8/582.85 = 17.081; and the other way:
    # 641.35 ∥ 12000 = 608.81, 1 + 9187.2/608.81 = 16.090
    assert plan.extremes() == (near(16.090), near(17.081))
    # level √(P·R)/16.542; headroom 4 V over it
    assert plan.wish.full_vrms == near(volts)
    assert plan.level_vrms == near(volts / 16.542)
    assert db(plan.headroom) == pytest.approx(20 * math.log10(4 * 16.542 / volts), rel=0, abs=0.005)
    # u: k = 9280/9877.09 = 0.93955; each R1 k/2 · 1 %/√3; each R2 k·597.09/1270; input k·597.09/10000 · 20 %/√3
    each_r1 = 0.93955 / 2 * 0.01 / math.sqrt(3)
    each_r2 = 0.93955 * 597.09 / 1270 * 0.01 / math.sqrt(3)
    pin = 0.93955 * 597.09 / 10000 * 0.2 / math.sqrt(3)
    relative = math.sqrt(2 * each_r1**2 + 2 * each_r2**2 + pin**2)
    assert plan.ratio().u / plan.ratio().value == near(relative)  # 0.83475 %
    # heat: I = U/9877.09; R1a I²·4640; R2a (U/16.542)²/1270
    parts = {part.name: part for part in plan.parts}
    assert parts["R1a"].running_w == near((volts / 9877.09) ** 2 * 4640)
    assert parts["R2b"].running_w == near((volts / 16.542) ** 2 / 1270)
    assert parts["R1a"].running_v == near(45 * 4640 / 9877.09)
    # source 9280 ∥ 635 = 594.33; with the input 561.0; 300 pF: 1/(2π·561.0·300e−12) = 945.7 kHz
    assert plan.leg.source_ohm == near(594.33)
    assert bandwidth_hz(plan) == near(945.7e3)
    # √(4·1.380649e−23·300·561.0·19980) = 430.9 nV; 4 V − 110 dB = 12.649 µV
    assert noise(plan).thermal_vrms == near(430.9e-9)
    assert noise(plan).interface_vrms == near(12.649e-6)


def test_single_ended_faults() -> None:
    """R1b shorted: 4640 −1 % = 4593.6 over 641.35 ∥ 12000 = 608.81; R2a open: 1282.7 ∥ 12000 = 1158.8 under 9187.2."""
    told = {(fault.part, fault.kind): fault for fault in faults(into_8_ohm())}
    short, opened = told["R1b", Kind.SHORT], told["R2a", Kind.OPEN]
    assert short.pin_v == near(45 * 608.81 / (4593.6 + 608.81))  # 5.266 V
    assert opened.pin_v == near(45 * 1158.83 / (9187.2 + 1158.83))  # 5.040 V
    assert short.limit_v == near(4 * math.sqrt(2))
    assert short.shorted_ma == near(45 / 4.5936)  # 9.796 mA
    assert short.input_ma == near(5.266 / 8.0)  # into 8 kΩ, the least that the input may have
    # most energy in a second: open voltage 45·641.35/(4593.6 + 641.35) = 5.513 V behind 562.78 Ω: V²/4R = 13.50 mJ
    assert short.most_energy_j == near(13.50e-3)
    assert short.level_vrms == near(28.284 * 597.09 / (4640 + 597.09))  # 3.225 V
    # R1a then bears 45 − 5.266 = 39.73 V: 343.7 mW of its 600, 39.73 of its 350 V
    assert short.heat_share == near(39.734**2 / 4593.6 / 0.6)
    assert short.voltage_share == near(39.734 / 350)
    for part in ("R1a", "R1b"):
        assert told[part, Kind.OPEN].pin_v == 0.0
    for part in ("R2a", "R2b"):
        assert told[part, Kind.SHORT].pin_v == 0.0
    assert all(fault.harmless for fault in told.values())


def test_bridge_tied_24_v() -> None:
    plan = bridge_24_v()
    assert plan.leg.upper_ohm == (2430.0, 2430.0)
    assert plan.leg.lower_ohm == (1270.0, 1270.0)
    # each pin: R1 = 4860; R2 = 635; half of 20 k: 635 ∥ 10000 = 597.09; ratio 1 + 4860/597.09 = 9.1395
    assert plan.leg.ratio == near(9.1395)
    # k = 4860/5457.09 = 0.89059; one of four halves of R1 moves the ratio by k/4 · 0.1 %/√3, one of R2 by
    # k/2 · 597.09/1270 · 0.1 %/√3, the input by k · 597.09/10000 · 20 %/√3
    parts_u = {part.source: abs(part.u) / 9.1395 for part in plan.ratio().parts}
    assert parts_u["attenuator R1b-"] == near(0.89059 / 4 * 0.001 / math.sqrt(3))
    assert parts_u["attenuator R2a+"] == near(0.89059 / 2 * 597.09 / 1270 * 0.001 / math.sqrt(3))
    assert parts_u["input impedance"] == near(0.89059 * 597.09 / 10000 * 0.2 / math.sqrt(3))
    # √(50·4) = 14.142 V over 9.1395 = 1.5474 V; 4 V over that: 8.249 dB
    assert plan.level_vrms == near(1.5474)
    assert db(plan.headroom) == pytest.approx(8.249, rel=0, abs=0.005)
    # a terminal at rest stands at 12 V and swings by 7.071 V rms: √(144 + 50) = 13.928 V; I = 13.928/5457.09 A
    parts = {part.name: part for part in plan.parts}
    assert parts["R1a"].running_w == near((13.928 / 5457.09) ** 2 * 2430)  # 15.83 mW
    assert parts["R2a"].running_w == near((13.928 / 9.1395) ** 2 / 1270)
    # against ground, input not counted: 1 + 4860/635 = 8.6535
    told = common_mode(plan)
    assert told.running_v == told.switch_on_v == near(12 / 8.6535)
    assert told.stuck_v == near(24 / 8.6535)
    assert told.swing_v == near(10 / 9.1395)
    # both pins: 2·(4860 ∥ 597.09) = 1063.5 Ω
    assert noise(plan).thermal_vrms == near(math.sqrt(4 * 1.380649e-23 * 300 * 1063.5 * 19980))


def test_bridge_tied_rejection() -> None:
    """G = 1/9.1395; against ground R1/R2 = 4860 ± t over 635 ∓ t; k = 4860/5495 = 0.88444."""
    plan = bridge_24_v()
    for tolerance in (0.001, 0.01):
        high = 635 * (1 + tolerance) / (4860 * (1 - tolerance) + 635 * (1 + tolerance))
        low = 635 * (1 - tolerance) / (4860 * (1 + tolerance) + 635 * (1 - tolerance))
        loading = 8.6535 / 9.1395
        worst = loading * (high + low) / 2 / (high - low)
        standard = loading * math.sqrt(3) / (0.88444 * tolerance * math.sqrt(2))  # halves average: √2 for a leg of four
        told = rejection(plan, tolerance)
        assert db(told.worst) == pytest.approx(20 * math.log10(worst), rel=0, abs=0.01)
        assert db(told.standard) == pytest.approx(20 * math.log10(standard), rel=0, abs=0.01)
    # 0.1 V of shared hum over 10^(48.59/20): 0.372 mV, to 14.142 V −91.6 dB
    told = rejection(plan)
    assert told.hum_worst_vrms == near(0.1 / told.worst)
    assert db(told.worst) == pytest.approx(48.6, rel=0, abs=0.05)
    assert db(told.standard) == pytest.approx(62.4, rel=0, abs=0.05)
    assert db(told.hum_worst) == pytest.approx(-91.6, rel=0, abs=0.05)
    # with 1 % parts in halves: 28.6 dB worst and 42.4 dB standard; with single parts the standard is 3 dB less
    coarse = rejection(plan, 0.01)
    assert (round(db(coarse.worst), 1), round(db(coarse.standard), 1)) == (28.6, 42.4)


def test_bridge_tied_faults() -> None:
    """R1a shorted, a terminal at 24 V, no input counted: 24·635.635/(2427.57 + 635.635) = 4.980 V at a pin."""
    told = {(fault.part, fault.kind): fault for fault in faults(bridge_24_v())}
    short, opened = told["R1a", Kind.SHORT], told["R1a", Kind.OPEN]
    assert short.pin_v == near(24 * 635.635 / (2427.57 + 635.635))
    assert short.shorted_ma == near(24 / 2.42757)
    # between the pins: half by the sound leg, half by the other: 14.142/2·(597.09/5457.09 + 597.09/3027.09) = 2.168 V
    assert short.level_vrms == near(2.1683)
    assert opened.level_vrms == near(1.5474 / 2)  # reads 6 dB low
    assert all(fault.harmless for fault in told.values())
