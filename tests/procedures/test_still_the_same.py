"""The check before a run: a gain that has moved is refused, and a loop alone is told to see only a product."""

import pytest

from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Span
from wattproof.dsp.uncertainty import known
from wattproof.procedures.still_the_same import Against, against_loop, against_voltage, refuse_moved

READING = Reading(span=Span(0, 48_000, 48_000.0), channel=2, settings=ReadingSettings(), state=State.OK)
SCALE = known(2.0, "V", "level calibration meter A", 0.005)


def test_the_same_meter_cancels_so_that_a_small_turn_is_seen() -> None:
    volts = known(1.0, "V", "level calibration meter A", 0.0025)
    still = against_voltage(measured(0.5, 1e-6, "1"), volts, SCALE)
    assert still.same
    assert still.allowed_db < 0.001
    turned = against_voltage(measured(0.5 * 1.012, 1e-6, "1"), volts, SCALE)  # the knob went up by 0.1 dB
    assert not turned.same
    assert turned.moved_db == pytest.approx(-0.103, rel=0.0, abs=0.002)  # the scale fell: 20·lg 1.012


def test_another_meter_allows_for_both() -> None:
    verdict = against_voltage(measured(0.5, 1e-6, "1"), known(1.0, "V", "level calibration meter B", 0.0025), SCALE)
    # by hand: √(0.25 %² + 0.25 %²)·1.96·8.686 dB
    assert verdict.allowed_db == pytest.approx(0.0602, rel=0.01, abs=0.0)


def test_a_loop_sees_the_product_only_and_says_so() -> None:
    verdict = against_loop(measured(1.0, 1e-6, "1"), measured(1.0, 1e-6, "1"))
    assert (verdict.same, verdict.against) == (True, Against.LOOP)
    assert "output times input" in verdict.against


def test_a_moved_gain_is_refused_with_a_way_out() -> None:
    refuse_moved(against_loop(measured(1.0, 1e-6, "1"), measured(1.0, 1e-6, "1")), READING)
    with pytest.raises(WrongUseError, match=r"input 2 has moved by \+0.09 dB.*turn the knob back, or calibrate anew"):
        refuse_moved(against_loop(measured(1.01, 1e-6, "1"), measured(1.0, 1e-6, "1")), READING)
