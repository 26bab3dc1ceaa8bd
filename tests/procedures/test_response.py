"""Level and phase against frequency: the simulated filters, whose closed form is known, are read as they are."""

import cmath
import math

import pytest

from tests.procedures.sitting import done, ran, result
from wattproof.bench.simulated.characters import CLASS_A_SINGLE
from wattproof.bench.simulated.extras import tone_prototypes
from wattproof.bench.simulated.truth import delayed, filtered, with_output_filter
from wattproof.core.notes import Kind
from wattproof.core.run import Ending
from wattproof.core.units import db
from wattproof.procedures.response import Method, ResponsePlan
from wattproof.procedures.response_result import ResponsePoint

REFERENCE_HZ = 997.0


def off_db(point: ResponsePoint, truth: complex) -> float:
    return db(point.relative.value / abs(truth))


def off_deg(point: ResponsePoint, truth: complex) -> float:
    assert point.phase_deg is not None
    return math.degrees(cmath.phase(cmath.exp(1j * math.radians(point.phase_deg.value)) / truth))


@pytest.mark.parametrize("row", [0, 1])
def test_the_output_filter_is_read_within_a_hundredth_of_a_decibel_at_both_loads(row: int) -> None:
    curve = done("response").curves[row]
    load_ohm = curve.row.load.nominal_ohm
    flat = abs(with_output_filter(load_ohm, 0.08, REFERENCE_HZ))
    assert len(curve.stepped) >= 4
    for point in curve.stepped:
        truth = with_output_filter(load_ohm, 0.08, point.frequency_hz) * delayed(point.frequency_hz) / flat
        assert abs(off_db(point, truth)) < 0.01
        assert abs(off_deg(point, truth)) < 0.1
        assert abs(off_db(point, truth)) < 3.0 * 8.686 * point.relative.u / point.relative.value


def test_the_output_filter_peaks_into_8_ohm_and_not_into_4() -> None:
    eight, four = done("response").curves
    assert db(eight.stepped[-1].relative.value) == pytest.approx(1.42, rel=0.0, abs=0.02)
    assert abs(db(four.stepped[-1].relative.value)) < 0.1
    assert Kind.PEAKS_AT in {note.kind for note in eight.notes}
    assert Kind.PEAKS_AT not in {note.kind for note in four.notes}


def test_a_sweep_of_ten_seconds_is_within_a_twentieth_of_a_decibel_from_50_hz() -> None:
    curve = done("sweep").curves[0]
    bass = tone_prototypes({"bass": 6.0})
    at_reference = abs(filtered(bass, REFERENCE_HZ))
    inside = [point for point in curve.swept if point.frequency_hz >= 50.0]
    assert len(inside) > 90
    for point in inside:
        # the interface's own coupling, a first order at 2 Hz, is in these figures: 0.007 dB at 50 Hz
        assert abs(off_db(point, filtered(bass, point.frequency_hz) / at_reference)) < 0.05
    assert Kind.LOOP_INSIDE in {note.kind for note in curve.notes}


def test_a_sweep_tells_the_second_harmonic_of_a_single_ended_stage() -> None:
    curve = done("sweep").curves[0]
    electrical = CLASS_A_SINGLE.electrical(8.0, CLASS_A_SINGLE.supply_v)
    # x·(1 + a·x/limit): half of a times peak over limit (y = x + a₂x² + …: H2 = a₂A/2, closed form)
    expected = 0.5 * CLASS_A_SINGLE.second * 2.0 * math.sqrt(2.0) / electrical.upper_v
    told = [each for each in curve.orders if each.order == 2 and 900.0 < each.frequency_hz < 1_100.0]
    assert told
    for each in told:
        assert each.ratio.limited_by is None
        assert each.ratio.value == pytest.approx(expected, rel=0.05, abs=0.0)


def test_tone_controls_are_shown_against_flat_with_what_they_cost() -> None:
    plan = ResponsePlan(channels="1", relative=True, from_hz=50.0, to_hz=4_800.0, per_octave=0.5, listening_w=2.0)
    curve = result(plan, {"bass": 9.0, "treble": -4.0}).curves[0]
    both = tone_prototypes({"bass": 9.0, "treble": -4.0})
    for point in curve.stepped:
        assert abs(off_db(point, filtered(both, point.frequency_hz))) < 0.01
        assert abs(off_deg(point, filtered(both, point.frequency_hz))) < 0.1
        assert point.power_ratio == pytest.approx(point.relative.value**2, rel=1e-12, abs=0.0)
    told = next(dict(note.values) for note in curve.notes if note.kind is Kind.BOOST_COSTS)
    lift = abs(filtered(both, 50.0)) ** 2
    assert told["ratio"] == pytest.approx(lift, rel=2e-3, abs=0.0)
    assert told["needed_w"] == pytest.approx(2.0 * lift, rel=2e-3, abs=0.0)


def test_the_corner_of_the_rumble_filter_is_its_minus_3_db_point() -> None:
    plan = ResponsePlan(channels="1", relative=True, from_hz=15.0, to_hz=1_500.0, per_octave=1.5)
    low_hz = result(plan, {"rumble": 1.0}).curves[0].low_hz
    # a Butterworth high-pass is 3.01 dB down at its corner; three points in two octaves place it within 1 %
    assert low_hz.value == pytest.approx(20.0, rel=0.01, abs=0.0)
    assert abs(low_hz.value - 20.0) < 3.0 * low_hz.u


def test_a_sweep_that_would_burn_parts_is_left_out_and_says_so() -> None:
    plan = ResponsePlan(channels="1", method=Method.SWEEP, level_vrms=6.0, from_hz=500.0, to_hz=4_000.0, sweep_s=1.0)
    found = ran(plan)
    assert found.ending is Ending.DONE
    curve = found.result.curves[0]
    assert curve.swept == ()
    assert Kind.SWEEP_TOO_LOUD in {note.kind for note in curve.notes}


def test_a_limit_ends_the_run_and_what_was_kept_stands() -> None:
    plan = ResponsePlan(channels="1", level_vrms=4.0, limit_vrms=2.0, from_hz=500.0, to_hz=4_000.0)
    found = ran(plan)
    assert found.ending is Ending.DONE
    assert Kind.LIMIT_REACHED in {note.kind for note in found.result.said}


def test_less_than_an_octave_is_refused() -> None:
    with pytest.raises(ValueError, match="less than an octave"):
        ResponsePlan(from_hz=1_000.0, to_hz=1_900.0)
