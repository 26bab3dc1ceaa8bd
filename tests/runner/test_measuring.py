"""Power measured on the simulated bench, by steps and by hand at three speeds, against the simulator's own truth."""

from functools import lru_cache

import attrs
import pytest

from wattproof.app import make_measurement, open_bench
from wattproof.bench.simulated import CHARACTERS, SimulatedBench
from wattproof.bench.simulated.truth import Truth
from wattproof.core.notes import Kind
from wattproof.core.run import Ending
from wattproof.core.units import db
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan
from wattproof.procedures.statement import StatedPoint, StatedRow
from wattproof.runner.measuring import Measured
from wattproof.runner.screen import Event, Progressed, ToneChanged

SHORT_HOLD_S = {"sagging-supply": 4.0}  # whose supply settles with 0.6 s; the others have settled at once


@lru_cache(maxsize=16)
def measured(character: str, plan: PowerPlan, hand_db_per_s: float = 6.0) -> Measured:
    bench = SimulatedBench(character)
    bench.open()
    measurement = make_measurement(bench, plan, None, hand_db_per_s)
    try:
        return measurement.run()
    finally:
        measurement.runner.close()


def off_db(point: StatedPoint, true_vrms: float, *, momentary: bool = False) -> float:
    """Return by how much a point's voltage is off, in dB."""
    volts = point.momentary_vrms if momentary else point.voltage_vrms
    assert volts is not None, point.why
    return db(volts.value / true_vrms)


def point_of(row: StatedRow, name: str) -> StatedPoint:
    point = row.at(name)
    assert point is not None
    return point


@pytest.mark.parametrize("character", CHARACTERS)
def test_by_steps_one_and_ten_per_cent_are_as_true(character: str) -> None:
    hold_s = SHORT_HOLD_S.get(character, 0.5)
    done = measured(character, StepsPlan(hold_s=hold_s, step_db=3.0))
    truth = Truth(character)
    assert (done.ending, done.why) == (Ending.DONE, "")
    row = done.statement.rows[0]
    for name, thdn in (("1 %", 0.01), ("10 %", 0.10)):
        point = point_of(row, name)
        assert point.held_s == hold_s
        assert abs(off_db(point, truth.vrms_at_thdn(thdn))) < 0.005, name
    # the definition finds where distortion has risen, which is above the geometric onset: by 0.1 dB for hard clipping,
    # 0.3 dB for the soft knee of the single-ended stage
    assert -0.03 < off_db(point_of(row, "onset"), truth.onset_vrms) < (0.35 if "class-a-" in character else 0.10)


@pytest.mark.parametrize(("speed", "strokes", "bound_db"), [(3.0, 1, 0.02), (6.0, 2, 0.02), (20.0, 2, 0.10)])
def test_by_hand_one_and_ten_per_cent_are_as_true(speed: float, strokes: int, bound_db: float) -> None:
    done = measured("class-d-bridge", HandPlan(hold_s=0.3, strokes=strokes), speed)
    truth = Truth("class-d-bridge")
    assert (done.ending, done.why) == (Ending.DONE, "")
    row = done.statement.rows[0]
    for name, thdn in (("1 %", 0.01), ("10 %", 0.10)):
        assert abs(off_db(point_of(row, name), truth.vrms_at_thdn(thdn), momentary=True)) < bound_db, name
        assert abs(off_db(point_of(row, name), truth.vrms_at_thdn(thdn))) < 0.005, name
    assert {each.mark.stroke for each in done.statement.curve} == set(range(strokes))
    assert Kind.SCRATCHY not in {note.kind for note in row.notes}


def test_a_scratchy_control_is_named_and_left_out() -> None:
    done = measured("scratchy-control", HandPlan(hold_s=0.0, strokes=1), 6.0)
    truth = Truth("scratchy-control")
    row = done.statement.rows[0]
    assert Kind.SCRATCHY in {note.kind for note in row.notes}
    for name, thdn in (("1 %", 0.01), ("10 %", 0.10)):
        assert abs(off_db(point_of(row, name), truth.vrms_at_thdn(thdn))) < 0.02, name


def test_a_sagging_supply_gives_less_once_held() -> None:
    done = measured("sagging-supply", HandPlan(hold_s=4.0, strokes=1), 20.0)
    truth = Truth("sagging-supply")
    row = done.statement.rows[0]
    point = point_of(row, "1 %")
    assert abs(off_db(point, truth.vrms_at_thdn(0.01))) < 0.01
    assert 0.05 < off_db(point, truth.vrms_at_thdn(0.01), momentary=True) < 0.6
    assert Kind.FLATTERS_MOMENTARY in {note.kind for note in row.notes}


def test_the_load_is_switched_and_recognised_without_a_person() -> None:
    done = measured("class-d-bridge", StepsPlan(loads="8,4", hold_s=0.0, step_db=3.0, read_s=0.4))
    assert [each.row.load.ohm for each in done.statement.rows] == [8.0, 4.0]
    assert Kind.LOAD_SEEN in {note.kind for note in done.statement.rows[1].notes}
    ratio = next(each.ratio for each in done.statement.ratios if each.at == "1 %")
    truths = [Truth("class-d-bridge", load_ohm=ohm).vrms_at_thdn(0.01) for ohm in (4.0, 8.0)]
    assert ratio.value == pytest.approx(2.0 * (truths[0] / truths[1]) ** 2, rel=3e-3, abs=0.0)


def test_whatever_breaks_in_whoever_looks_on_the_tone_is_silent_and_what_was_kept_is_there() -> None:
    bench = SimulatedBench()
    bench.open()
    measurement = make_measurement(bench, StepsPlan())
    heard: list[ToneChanged] = []
    progressed: list[Progressed] = []

    def look(event: Event) -> None:
        match event:
            case ToneChanged():
                heard.append(event)
            case Progressed():
                progressed.append(event)
                if len(progressed) > 8:
                    raise KeyboardInterrupt
            case _:
                pass

    with pytest.raises(KeyboardInterrupt):
        measurement.run(look)
    stopped = measurement.measured()
    measurement.runner.close()
    assert stopped.ending is Ending.STOPPED
    assert len(stopped.statement.curve) > 3
    assert measurement.runner.muted
    assert not measurement.runner.running


def test_the_runners_own_limits_stand_behind_the_plans() -> None:
    bench = SimulatedBench()
    bench.open()
    measurement = make_measurement(bench, StepsPlan(limit_vrms=5.0, limit_w=2.0, limit_over_s=3.0))
    limits = measurement.runner.rig.limits
    assert limits.output_vrms == pytest.approx(5.25, rel=1e-12, abs=0.0)
    assert limits.power_w == pytest.approx(2.1, rel=1e-12, abs=0.0)
    assert limits.over_rating_s == pytest.approx(3.15, rel=1e-12, abs=0.0)
    done = measurement.run()
    measurement.runner.close()
    assert done.ending is Ending.DONE
    highest = max(each.point.voltage_vrms for each in done.statement.curve if each.point is not None)
    assert highest < 4.0  # 2 W into 8 Ω


def test_a_bench_that_is_opened_by_its_name_measures_too() -> None:
    bench = open_bench("simulated:class-a-single", pace="free")
    measurement = make_measurement(bench, attrs.evolve(StepsPlan(), drive_vrms=0.01, hold_s=0.0))
    done = measurement.run()
    measurement.runner.close()
    assert done.statement.rows[0].points[0].why is not None
