"""Uncertainties combine as the GUM has it."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wattproof.core.quantity import STATISTICS, Part, Quantity, measured

_EXACT = 1e-12  # a few float64 operations


def _end_gauge() -> Quantity:
    """Return the end gauge of JCGM 100:2008, H.1, from its inputs: sensitivity times standard uncertainty, in nm."""
    length_nm = 50_000_623.0
    return Quantity(
        50_000_838.0,
        "nm",
        (
            Part("standard's certificate", 25.0, 18),
            Part("repeated comparisons", 5.8, 24),
            Part("comparator, random", 3.9, 5),
            Part("comparator, systematic", 6.7, 8),
            Part("difference of expansion", length_nm * 0.1 * 1e-6 / math.sqrt(3.0), 50),
            Part("difference of temperature", length_nm * 11.5e-6 * 0.05 / math.sqrt(3.0), 2),
        ),
    )


def test_the_end_gauge_of_the_gum_has_its_uncertainty_and_degrees_of_freedom() -> None:
    gauge = _end_gauge()
    # JCGM 100:2008, H.1.6, prints u_c = 32 nm and ν_eff = 16.7 (from unrounded u). Three general libraries agree on
    # the unrounded 31.663 879 and 16.751 856 (GTC 1.5.1, metrolopy 1.1.1, hand); bounds: half of the last digit.
    assert gauge.u == pytest.approx(31.663879, rel=0.0, abs=5e-7)
    assert gauge.dof == pytest.approx(16.751856, rel=0.0, abs=5e-7)


def test_the_end_gauges_contributions_are_those_that_the_gum_prints() -> None:
    # JCGM 100:2008, table H.1: 25, 5.8, 3.9, 6.7, 2.9 and 16.6 nm
    printed = (25.0, 5.8, 3.9, 6.7, 2.9, 16.6)
    assert [part.u for part in _end_gauge().parts] == pytest.approx(printed, rel=0.0, abs=0.05)


def test_the_uncertainty_of_a_power_from_voltage_and_resistance() -> None:
    # P = V²/R, V = 20.00 V (u 0.04, ν 9), R = 8.00 Ω (u 0.08): by hand u = √(0.2² + 0.5²) = 0.538 516 W,
    # ν = u⁴/(0.2⁴/9) = 473.06; GTC 1.5.1 gives the same.
    power = Quantity(50.0, "W", (Part("voltage", 2 * 20.0 / 8.0 * 0.04, 9), Part("resistance", -50.0 / 8.0 * 0.08)))
    assert power.u == pytest.approx(0.538516, rel=0.0, abs=5e-7)
    assert power.dof == pytest.approx(473.06, rel=0.0, abs=5e-3)


def test_a_quantity_without_parts_is_exact() -> None:
    exact = Quantity(1.0, "V")
    assert exact.u == 0.0
    assert math.isinf(exact.dof)


def test_a_measured_quantity_has_its_statistics_as_the_only_part() -> None:
    assert measured(2.0, 0.1, "V", 7.0).parts == (Part(STATISTICS, 0.1, 7.0),)


@given(st.lists(st.floats(1e-6, 1e6), min_size=1, max_size=6), st.floats(1.0, 1e4))
def test_the_degrees_of_freedom_lie_between_the_least_part_and_the_sum(parts: list[float], dof: float) -> None:
    quantity = Quantity(0.0, "V", tuple(Part(str(n), u, dof) for n, u in enumerate(parts)))
    # GUM G.4.1, below formula G.2b: ν_eff ≤ Σ ν_i; it is never below the least ν_i. 1e-9 is room for rounding.
    assert dof * (1 - 1e-9) <= quantity.dof <= dof * len(parts) * (1 + 1e-9)


@given(st.floats(-1e6, 1e6), st.floats(1e-9, 1e3), st.floats(-1e3, 1e3).filter(lambda factor: abs(factor) > 1e-6))
def test_an_exact_factor_scales_value_and_uncertainty_alike(value: float, u: float, factor: float) -> None:
    scaled = measured(value, u, "V", 9.0).scaled(factor, "mV")
    assert scaled.value == pytest.approx(value * factor, rel=_EXACT, abs=0.0)
    assert scaled.u == pytest.approx(u * abs(factor), rel=_EXACT, abs=0.0)
    assert scaled.dof == pytest.approx(9.0, rel=_EXACT, abs=0.0)
    assert scaled.unit == "mV"


def test_what_limits_a_quantity_stays_with_it() -> None:
    assert Quantity(1e-6, "1", (), "interface").scaled(2.0, "1").limited_by == "interface"


@pytest.mark.parametrize("dof", [0.0, -1.0, math.nan])
def test_a_part_without_degrees_of_freedom_is_refused(dof: float) -> None:
    with pytest.raises(ValueError, match=r"Part\.dof is .* for statistics; it must be above zero"):
        Part(STATISTICS, 0.1, dof)
