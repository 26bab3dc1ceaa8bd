"""The rig's attenuator: its loaded ratio against tabled dividers, and the budget of its parts."""

import math

import pytest

from wattproof.core.rig import Attenuator
from wattproof.dsp.attenuation import attenuation, cable_factor


def divider(input_ohm: float | None) -> Attenuator:
    return Attenuator(r1a_ohm=10_000.0, r2a_ohm=1_000.0, input_ohm=input_ohm, input_tolerance=0.0, cable_pf=0.0)


@pytest.mark.parametrize(("input_ohm", "ratio"), [(None, 11.0), (10_000.0, 12.0), (47_000.0, 11.2128), (1e6, 11.01)])
def test_the_ratio_is_loaded_by_the_input(input_ohm: float | None, ratio: float) -> None:
    # 1 + R1/(R2 ∥ Rin) by hand, to the digits given
    assert attenuation(divider(input_ohm), "left").value == pytest.approx(ratio, rel=5e-6, abs=0.0)


def test_two_one_per_cent_parts_cost_three_quarters_of_a_per_cent() -> None:
    quantity = attenuation(divider(None), "left")
    # by hand: R1/(R1+R2)·√2·0.01/√3 = 0.7423 %
    assert quantity.u / quantity.value == pytest.approx(0.007423, rel=1e-3, abs=0.0)


def test_an_input_that_loads_more_than_stated_moves_the_ratio_further_than_one_that_loads_less() -> None:
    loaded = Attenuator(r1a_ohm=10_000.0, r2a_ohm=1_000.0, tolerance=0.0, input_ohm=10_000.0, input_tolerance=0.2)
    quantity = attenuation(loaded, "left")
    # 1 + 10·(1 + 1/8) = 12.25 at 8 kΩ, 12 at 10 kΩ, 11.8333 at 12 kΩ, by hand: 0.25 is the larger
    assert quantity.value == pytest.approx(12.0, rel=1e-12, abs=0.0)
    assert quantity.u == pytest.approx(0.25 / math.sqrt(3.0), rel=1e-12, abs=0.0)


def test_channels_and_the_legs_of_a_bridge_are_independent() -> None:
    left, right = attenuation(divider(None), "left"), attenuation(divider(None), "right")
    assert {part.source for part in left.parts}.isdisjoint(part.source for part in right.parts)
    bridge = attenuation(divider(None), "left", bridge_tied=True)
    assert bridge.u == pytest.approx(left.u / math.sqrt(2.0), rel=1e-12, abs=0.0)


def test_a_measured_ratio_has_its_own_limits_and_a_bare_one_none() -> None:
    measured = attenuation(Attenuator(ratio=11.0, measured_accuracy=0.003), "left")
    assert measured.u == pytest.approx(0.033 / math.sqrt(3.0), rel=1e-12, abs=0.0)
    assert attenuation(Attenuator(ratio=11.0), "left").parts == ()


def test_the_cable_raises_the_ratio_at_high_frequencies() -> None:
    attenuator = Attenuator(r1a_ohm=10_000.0, r2a_ohm=1_000.0, cable_pf=300.0)
    resistance = 10_000.0 * 1_000.0 / 11_000.0
    pole_hz = 1.0 / (2.0 * math.pi * resistance * 300e-12)  # 583.6 kHz
    assert cable_factor(attenuator, pole_hz) == pytest.approx(math.sqrt(2.0), rel=1e-12, abs=0.0)
    assert cable_factor(Attenuator(ratio=10.0), 20_000.0) == 1.0
