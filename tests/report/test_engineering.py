"""Numbers are written as engineers write them."""

import math

import pytest

from wattproof.report.engineering import decibels_text, engineering, resistance


@pytest.mark.parametrize(
    ("number", "unit", "text"),
    [
        (0.0432, "W", "43.2 mW"),
        (28.284, "V", "28.3 V"),
        (945_700.0, "Hz", "946 kHz"),
        (430.9e-9, "V", "431 nV"),
        (999.6, "V", "1.00 kV"),  # a carry takes the next prefix
        (9.996, "V", "10.0 V"),
        (0.0, "J", "0 J"),
        (-0.0123, "V", "−12.3 mV"),
        (math.inf, "Hz", "unlimited"),
        (1e-15, "F", "0.00100 pF"),
    ],
)
def test_a_number_has_three_digits_and_a_prefix(number: float, unit: str, text: str) -> None:
    assert engineering(number, unit) == text


def test_more_digits_where_they_are_wanted() -> None:
    assert engineering(28.28427, "V", 4) == "28.28 V"


@pytest.mark.parametrize(
    ("ohm", "text"),
    [(4640.0, "4.64 kΩ"), (635.0, "635 Ω"), (1.0, "1 Ω"), (1e6, "1 MΩ"), (1e7, "10 MΩ"), (8.2, "8.2 Ω")],
)
def test_a_resistor_has_the_digits_of_its_series(ohm: float, text: str) -> None:
    assert resistance(ohm) == text


def test_decibels_have_a_true_minus() -> None:
    assert decibels_text(-91.58) == "−91.6 dB"
    assert decibels_text(0.00186, 4) == "0.0019 dB"
