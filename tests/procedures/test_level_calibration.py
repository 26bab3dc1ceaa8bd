"""Volts per full scale from a meter: the frequency that is proposed, the meter's limits, and slips of the unit."""

import math

import numpy as np
import pytest

from wattproof.core.errors import WrongUseError
from wattproof.core.loopback import Response
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Span
from wattproof.procedures.level_calibration import CLEAR_HZ, Meter, full_scale, meter_reading, propose


def reading(
    level_fs: float = 0.5, thdn: float = 1e-5, frequency_hz: float = 1010.0, state: State = State.OK
) -> Reading:
    return Reading(
        span=Span(0, 48_000, 48_000.0),
        channel=1,
        settings=ReadingSettings(),
        state=state,
        fundamental_hz=measured(frequency_hz, 0.0, "Hz"),
        level_fs=measured(level_fs, 1e-6, "1"),
        thdn=measured(thdn, 0.0, "1"),
        thd=measured(thdn, 0.0, "1"),
    )


@pytest.mark.parametrize(
    ("low_hz", "high_hz"), [(45.0, 400.0), (20.0, 20_000.0), (40.0, 500.0), (50.0, 60.0), (45.0, 1_000.0)]
)
def test_the_proposed_frequency_is_inside_the_band_and_clear_of_the_mains(low_hz: float, high_hz: float) -> None:
    if high_hz == 60.0:
        with pytest.raises(WrongUseError, match="no frequency 7 Hz clear"):
            propose(Meter(low_hz=low_hz, high_hz=high_hz))
        return
    proposal = propose(Meter(low_hz=low_hz, high_hz=high_hz))
    assert low_hz <= proposal.frequency_hz <= high_hz
    multiples = [mains * n for mains in (50.0, 60.0) for n in range(1, 500)]
    assert min(abs(proposal.frequency_hz - hz) for hz in multiples) >= CLEAR_HZ
    assert "hum does not beat" in proposal.why


def test_a_wide_meter_is_asked_near_one_kilohertz() -> None:
    assert propose(Meter(low_hz=20.0, high_hz=20_000.0)).frequency_hz == pytest.approx(1_000.0, rel=0.02, abs=0.0)


def test_the_data_sheet_makes_the_doubt() -> None:
    meter = Meter(percent=0.5, digits=3, step_v=0.001)
    volts = meter_reading(meter, 1.0)
    # ±(0.5 % of 1 V + 3 mV) = ±8 mV rectangular (GUM 4.3.7), and ±0.5 mV for the last digit (GUM F.2.2.1), by hand
    assert volts.u == pytest.approx(math.hypot(8e-3 / math.sqrt(3.0), 1e-3 / math.sqrt(12.0)), rel=1e-9, abs=0.0)


def test_full_scale_is_volts_over_level() -> None:
    meter = Meter(percent=0.5, digits=0, step_v=1e-6)
    scale = full_scale(reading(), meter_reading(meter, 1.0), meter)
    assert scale.value == pytest.approx(2.0, rel=1e-12, abs=0.0)
    assert scale.u / scale.value == pytest.approx(0.005 / math.sqrt(3.0), rel=1e-4, abs=0.0)


def test_it_is_carried_to_one_kilohertz_by_half_of_the_loops_bend() -> None:
    meter = Meter(percent=0.1, digits=0, step_v=1e-6)
    response = Response(np.array([100.0, 1_000.0]), np.array([0.98, 1.0], dtype=complex))
    scale = full_scale(reading(frequency_hz=100.0), meter_reading(meter, 1.0), meter, response)
    # at 100 Hz the input lets √0.98 through: 1 V would read higher at 1 kHz, so full scale is lower there
    assert scale.value == pytest.approx(2.0 * math.sqrt(0.98), rel=1e-9, abs=0.0)


def test_an_average_responding_meter_and_a_burden_cost_their_share() -> None:
    meter = Meter(percent=0.0, digits=0, step_v=1e-9, true_rms=False, burden_ohm=1e6)
    scale = full_scale(reading(thdn=3e-4), meter_reading(meter, 1.0), meter, source_ohm=600.0)
    told = {part.source: abs(part.u) / scale.value * math.sqrt(3.0) for part in scale.parts}
    assert told["level calibration waveform"] == pytest.approx(1e-4, rel=1e-9, abs=0.0)  # a third of the distortion
    assert told["level calibration burden"] == pytest.approx(6e-4, rel=1e-9, abs=0.0)


@pytest.mark.parametrize(
    ("read_v", "expected_v", "range_v", "words"),
    [
        (998.0, 1.0, None, "it looks like mV; give volts, 0.998"),
        (998.0, None, 2.0, "beyond its range of 2 V: it looks like mV; give volts, 0.998"),
        (45.0, 1.0, None, "look at the range, the unit and AC mode"),
        (0.0, None, None, "above zero"),
        (math.nan, None, None, "above zero"),
    ],
)
def test_a_slip_of_the_unit_is_said(read_v: float, expected_v: float | None, range_v: float | None, words: str) -> None:
    with pytest.raises(WrongUseError, match=words):
        meter_reading(Meter(range_v=range_v), read_v, expected_v)


def test_a_scale_that_no_interface_has_is_refused() -> None:
    meter = Meter()
    with pytest.raises(WrongUseError, match=r"which no audio interface has: it looks like mV; give volts, 0\.998"):
        full_scale(reading(), meter_reading(meter, 998.0), meter)


def test_a_tone_that_is_not_clean_or_not_read_is_refused() -> None:
    meter = Meter()
    with pytest.raises(WrongUseError, match="never a class-D or clipped output"):
        full_scale(reading(thdn=2e-3), meter_reading(meter, 1.0), meter)
    with pytest.raises(WrongUseError, match="could not be read"):
        full_scale(reading(state=State.OVERLOAD), meter_reading(meter, 1.0), meter)
