"""Decibels, volts and watts agree with the trade's tables."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wattproof.core.units import DB_PER_RELATIVE, SINE_PEAK_TO_RMS, ZERO_DBU_VRMS, db, from_db, power_w


def test_zero_dbu_is_a_milliwatt_in_600_ohm() -> None:
    # AES2id / common definition: 0 dBu = √(0.001 W · 600 Ω) = √0.6 V = 0.774 596 669 V, no load implied; closed form
    assert pytest.approx(0.774596669, rel=0.0, abs=5e-10) == ZERO_DBU_VRMS
    assert power_w(ZERO_DBU_VRMS, 600.0) == pytest.approx(1e-3, rel=1e-12, abs=0.0)


@pytest.mark.parametrize(
    ("level_vrms", "level_dbu"),
    [(1.0, 2.21849), (1.227653, 4.0), (0.316228, -7.78151)],  # by hand: 20 lg(V/√0.6); +4 dBu and −10 dBV line levels
)
def test_voltages_in_dbu(level_vrms: float, level_dbu: float) -> None:
    assert db(level_vrms / ZERO_DBU_VRMS) == pytest.approx(level_dbu, rel=0.0, abs=5e-6)


@pytest.mark.parametrize(
    ("ratio", "level_db"),
    # closed form 20 lg x, to five decimals: a tenth, a half, the square root of two, 1 %, 0.001 %
    [(0.1, -20.0), (0.5, -6.02060), (math.sqrt(2.0), 3.01030), (0.01, -40.0), (1e-5, -100.0)],
)
def test_ratios_in_decibels(ratio: float, level_db: float) -> None:
    assert db(ratio) == pytest.approx(level_db, rel=0.0, abs=5e-6)


@pytest.mark.parametrize(
    ("level_vrms", "load_ohm", "watts"),
    # closed form P = V²/R: 2.83 V is 1.001 11 W in 8 Ω and 2.002 23 W in 4 Ω; 20 V is 50 W in 8 Ω, 100 W in 4 Ω
    [(2.83, 8.0, 1.00111), (2.83, 4.0, 2.00223), (20.0, 8.0, 50.0), (20.0, 4.0, 100.0)],
)
def test_watts_of_a_voltage_across_a_load(level_vrms: float, load_ohm: float, watts: float) -> None:
    assert power_w(level_vrms, load_ohm) == pytest.approx(watts, rel=0.0, abs=5e-6)


def test_a_sines_crest_factor_is_three_decibels() -> None:
    assert db(SINE_PEAK_TO_RMS) == pytest.approx(3.0103, rel=0.0, abs=5e-6)  # closed form 10 lg 2


def test_nothing_is_minus_infinity_decibels() -> None:
    assert db(0.0) == -math.inf


def test_a_negative_ratio_has_no_decibels() -> None:
    with pytest.raises(ValueError, match=r"math domain error|expected a positive input"):
        db(-1.0)


@given(st.floats(-400.0, 400.0))
def test_decibels_there_and_back(level_db: float) -> None:
    assert db(from_db(level_db)) == pytest.approx(level_db, rel=0.0, abs=1e-11)  # a few float64 steps of 400


@given(st.floats(1e-9, 1e9))
def test_a_small_relative_change_in_decibels(ratio: float) -> None:
    change_db = db(ratio * (1 + 1e-6)) - db(ratio)
    # the second-order term is half of 1e-6 of it; 1e-12 dB is rounding of two levels of up to 180 dB
    assert change_db == pytest.approx(DB_PER_RELATIVE * 1e-6, rel=6e-7, abs=1e-12)
