"""The attenuator measured: its ratio from two voltages, and the rejection of a bridge's two legs."""

import math

import pytest

from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import Quantity, measured
from wattproof.core.rig import Attenuator
from wattproof.dsp.uncertainty import known
from wattproof.procedures.attenuator_measured import bridge_rejection, measured_ratio

SCALE = known(2.0, "V", "level calibration blue", 0.01)


def test_the_ratio_is_terminals_over_input_and_the_meter_cancels() -> None:
    found = measured_ratio(
        known(24.0, "V", "level calibration blue", 0.12), measured(1.0, 1e-5, "1"), SCALE, Attenuator()
    )
    assert found.value == pytest.approx(12.0, rel=1e-12, abs=0.0)
    assert found.u / found.value == pytest.approx(1e-5, rel=1e-6, abs=0.0)  # 0.5 % each, of one meter


def test_a_ratio_that_its_resistors_cannot_make_is_refused() -> None:
    divider = Attenuator(r1a_ohm=10_000.0, r2a_ohm=1_000.0)
    with pytest.raises(WrongUseError, match="measures ÷24 and its resistors make ÷11; look at the wiring"):
        measured_ratio(Quantity(24.0, "V"), measured(0.5, 0.0, "1"), SCALE, divider)


def test_the_rejection_is_difference_over_common_gain() -> None:
    # 5 V on both taps leave 2 mV at the input; the attenuation is 10: (1/10)/(0.002/5) = 250, 48 dB
    found = bridge_rejection(measured(1e-3, 1e-6, "1"), SCALE, Quantity(5.0, "V"), 10.0)
    assert 20.0 * math.log10(found.value) == pytest.approx(47.96, rel=0.0, abs=0.01)
    assert found.u / found.value == pytest.approx(math.hypot(1e-3, 0.005), rel=1e-6, abs=0.0)
    with pytest.raises(WrongUseError, match="nothing stands on the taps"):
        bridge_rejection(measured(1e-3, 1e-6, "1"), SCALE, Quantity(0.0, "V"), 10.0)
    with pytest.raises(WrongUseError, match="drowns in the noise"):
        bridge_rejection(measured(1e-7, 1e-6, "1"), SCALE, Quantity(5.0, "V"), 10.0)
