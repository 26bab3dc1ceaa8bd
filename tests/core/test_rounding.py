"""A quantity is written as the GUM and the trade write it."""

import math
from decimal import Decimal

import numpy as np
import pytest
import scipy.special
from hypothesis import given
from hypothesis import strategies as st

from wattproof.core.quantity import Quantity, measured
from wattproof.core.rounding import expanded, rounded, stated, t95


@pytest.mark.parametrize(
    ("dof", "factor"),
    # JCGM 100:2008, table G.2, column 95 %, with further digits from scipy.special.stdtrit; bound: half the last digit
    [
        (1, 12.706),
        (2, 4.3027),
        (3, 3.1824),
        (4, 2.7764),
        (5, 2.5706),
        (6, 2.4469),
        (8, 2.3060),
        (9, 2.2622),
        (10, 2.2281),
        (15, 2.1314),
        (16, 2.1199),
        (20, 2.0860),
        (30, 2.0423),
        (50, 2.0086),
        (100, 1.9840),
        (math.inf, 1.9600),
    ],
)
def test_the_factor_is_that_of_the_table(dof: float, factor: float) -> None:
    assert t95(dof) == pytest.approx(factor, rel=0.0, abs=5e-4 if dof == 1 else 5e-5)


@given(st.integers(1, 10**6))
def test_the_factor_is_students_at_every_degree_of_freedom(dof: int) -> None:
    truth = float(scipy.special.stdtrit(dof, 0.975))  # a general library
    assert t95(dof) == pytest.approx(truth, rel=1e-5, abs=0.0)  # far below the two digits that are written


def test_degrees_of_freedom_are_cut_to_a_whole_number() -> None:
    # JCGM 100:2008, G.4.1 and H.1.6: ν_eff = 16.7 is taken as 16, for which k95 = 2.12
    assert t95(16.751856) == t95(16)
    assert t95(16.751856) == pytest.approx(2.12, rel=0.0, abs=5e-3)


def test_less_than_one_degree_of_freedom_gives_no_interval() -> None:
    assert math.isinf(t95(0.9))
    assert rounded(measured(1.0, 0.1, "W", 0.9)) == ("1.0", "unknown")


def test_the_mass_of_the_gum_is_written_as_the_gum_writes_it() -> None:
    # JCGM 100:2008, 7.2.4: m_S = (100.021 47 ± 0.000 79) g, U = k·u_c with u_c = 0.35 mg and k = 2.26 for ν = 9
    assert rounded(measured(100.02147, 0.35e-3, "g", 9)) == ("100.02147", "0.00079")


@pytest.mark.parametrize(
    ("value", "uncertainty", "written"),
    [
        (10.057_62, 0.027, ("10.058", "0.027")),  # JCGM 100:2008, 7.2.6: y = 10.057 62 Ω, u = 27 mΩ gives 10.058 Ω
        (9.96, 9.96, ("10", "10")),  # a carry keeps two digits
        (0.0996, 0.0996, ("0.10", "0.10")),
        (34_567.0, 1234.0, ("34600", "1200")),
        (-0.0004, 0.01, ("0.000", "0.010")),  # no negative nothing
        (0.0, 0.5, ("0.00", "0.50")),
        (1.0, 0.0, ("1", "0")),
        (1.234e-20, 2.0e-22, ("1234e-23", "20e-23")),
        (1.234e15, 2.0e13, ("1234e12", "20e12")),
    ],
)
def test_both_are_written_to_the_place_of_the_uncertainty(
    value: float, uncertainty: float, written: tuple[str, str]
) -> None:
    quantity = measured(value, uncertainty / t95(math.inf), "1")
    assert expanded(quantity) == pytest.approx(uncertainty, rel=1e-12, abs=0.0)
    assert rounded(quantity) == written


@pytest.mark.parametrize(
    ("value", "uncertainty", "unit", "text"),
    [
        (5.5312e-3, 0.12e-3, "V rms", "5.53 ± 0.12 mV rms"),
        (0.0123, 0.0011, "W", "12.3 ± 1.1 mW"),
        (4.567e-6, 0.12e-6, "V", "4.57 ± 0.12 µV"),
        (997.0001, 0.002, "Hz", "997.0001 ± 0.0020 Hz"),
        (19_999.4, 12.0, "Hz", "19.999 ± 0.012 kHz"),
        (0.000_123, 0.000_004, "1", "0.0001230 ± 0.0000040"),
        (-80.04, 0.21, "dB", "-80.04 ± 0.21 dB"),
        (0.0, 0.0, "V", "0 V"),
    ],
)
def test_a_unit_takes_its_prefix(value: float, uncertainty: float, unit: str, text: str) -> None:
    assert stated(measured(value, uncertainty / t95(math.inf), unit)) == text


@given(
    st.floats(-1e30, 1e30).filter(lambda value: value == 0.0 or abs(value) > 1e-30),
    st.floats(1e-30, 1e30),
    st.integers(1, 1000),
)
def test_what_is_written_is_right_to_half_of_its_last_digit(value: float, u: float, dof: int) -> None:
    quantity = measured(value, u, "V", dof)
    written, spread = (Decimal(text) for text in rounded(quantity))
    place = Decimal(10) ** (spread.adjusted() - 1)  # of the second significant digit
    assert abs(written - Decimal(repr(value))) <= place / 2
    assert abs(spread - Decimal(repr(expanded(quantity)))) <= place / 2
    assert spread > 0


def test_numpy_scalars_are_written_like_numbers() -> None:
    assert rounded(measured(np.float64(10.05762), np.float64(0.0138), "Ω")) == ("10.058", "0.027")


def test_a_limit_is_written_like_any_quantity() -> None:
    assert rounded(Quantity(0.5, "1", (), "interface")) == ("0.5", "0")
