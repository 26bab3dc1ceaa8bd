"""THD+N against frequency: the output stays where it shall, and harmonics beyond the band are not taken for better."""

import math

import pytest

from tests.procedures.sitting import done
from wattproof.bench.simulated.truth import Truth
from wattproof.core.notes import Kind
from wattproof.procedures.frequency import FrequencyPlan


def test_the_output_stays_constant() -> None:
    for point in done("frequency").curves[0].points:
        assert point.level_vrms.value == pytest.approx(2.0, rel=0.005, abs=0.0)


def truth_at(frequency_hz: float, level_vrms: float) -> float:
    """Return the true THD+N where the output is level_vrms: what crossover takes away is put on what is wanted."""
    truth = Truth("class-ab-crossover", frequency_hz=frequency_hz)
    wanted_v = math.sqrt(2.0) * level_vrms
    for _ in range(4):
        wanted_v *= level_vrms / truth.at(wanted_v)[0]
    return truth.at(wanted_v)[1]


def test_thdn_is_the_truth_wherever_it_is_stated() -> None:
    stated = [point for point in done("frequency").curves[0].points if point.thdn is not None]
    assert len(stated) >= 3
    for point in stated:
        expected = truth_at(point.frequency_hz, point.level_vrms.value)
        # the interface's own output noise, taken out in power, is 1 % of this amplifier's power of THD+N
        assert abs(point.thdn.value - expected) < 3.0 * point.thdn.u + 0.002 * expected


def test_where_no_harmonic_is_left_thdn_is_not_stated() -> None:
    curve = done("frequency").curves[0]
    top = curve.points[-1]
    assert top.frequency_hz == pytest.approx(20_000.0, rel=1e-9, abs=0.0)
    assert (top.thdn, top.thd, top.harmonics_inside) == (None, None, 0)
    assert top.noise is not None
    assert "no harmonic inside the band" in top.remark
    assert Kind.HARMONICS_LEAVE in {note.kind for note in curve.notes}


def test_tones_outside_40_hz_to_5_khz_come_in_bursts() -> None:
    curve = done("frequency").curves[0]
    assert Kind.BURST_POINTS in {note.kind for note in curve.notes}


def test_a_tone_below_the_band_is_refused() -> None:
    with pytest.raises(ValueError, match="begin inside the band"):
        FrequencyPlan(from_hz=10.0)
