"""Numbers as a person reads them."""

import pytest

from wattproof.core.quantity import measured
from wattproof.gui import figures


@pytest.mark.parametrize(
    ("value", "uncertainty", "number", "spread"),
    [
        (0.9413, 0.013, "0.941", "0.013"),  # two digits of the uncertainty (JCGM 100:2008, 7.2.6)
        (0.9413, 0.13, "0.94", "0.13"),
        (99.96, 0.2, "100", "0.20"),  # three digits are what two metres can use
        (9.996, 0.001, "10.0", "< 0.01"),
        (0.0, 0.02, "0.00", "0.020"),
        (-0.0001, 0.5, "0.00", "0.50"),
    ],
)
def test_digits_follow_the_uncertainty(value: float, uncertainty: float, number: str, spread: str) -> None:
    shown = figures.worded(value, uncertainty, "%")
    assert (shown.number, shown.plus_minus) == (number, spread)


def test_a_minus_sign_is_no_hyphen() -> None:
    assert figures.number(-3.25, 1) == "−3.2"
    assert figures.decibels(0.01) == "−40.0 dB"


def test_small_values_get_a_prefix() -> None:
    assert str(figures.prefixed(0.0123, 0.0, "W")) == "12.3 mW"
    assert str(figures.prefixed(0.5, 0.0, "V")) == "0.500 V"
    assert str(figures.prefixed(3.1e-6, 0.0, "V")) == "3.10 µV"


def test_a_level_of_nothing_has_no_decibels() -> None:
    assert figures.decibels(0.0) == figures.DASH


def test_uncertainty_in_decibels_is_first_order() -> None:
    # 8.686 dB for each relative unit (20/ln 10), times 1.96 for 95 %
    assert figures.decibel_uncertainty(measured(0.5, 0.005, "1")) == pytest.approx(0.17024, rel=1e-3, abs=0.0)
