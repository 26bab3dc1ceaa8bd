"""Power by steps on an amplifier on paper: the closed forms come out, and the guard holds in every case."""

from itertools import pairwise

import attrs
import pytest

from tests.procedures.paper_amplifier import FULL_SCALE_VRMS, Paper
from wattproof.core.errors import StoppedError, WattproofError, WrongUseError
from wattproof.core.notes import Kind
from wattproof.core.rig import Rig
from wattproof.core.units import db, from_db
from wattproof.procedures.guard import BURST_DUTY, BURST_S, PRESENCE_S
from wattproof.procedures.power_plan import Driven, StepsPlan
from wattproof.procedures.power_rows import rows_of
from wattproof.procedures.power_steps import power
from wattproof.procedures.requests import Action, Kept, Role, Said
from wattproof.procedures.statement import PowerStatement, conclude

SCALE = 40.0  # V rms at the terminals of a full-scale sine at the input
PLAN = StepsPlan(full_scale_vrms=SCALE, hold_s=2.0)


def stated(paper: Paper, plan: StepsPlan = PLAN, rated_w: float | None = 100.0) -> PowerStatement:
    place = paper.place(rated_w=rated_w)
    paper.run(power(plan, place))
    return conclude(plan, rows_of(plan, place), paper.records)


def watts(statement: PowerStatement, at: str, row: int = 0) -> float:
    point = statement.rows[row].at(at)
    assert point is not None
    assert point.power_w is not None, point.why
    return point.power_w.value


def longest_burst_s(paper: Paper) -> float:
    """Return the longest time for which a level above zero stood."""
    return max(spell for level, spell in zip(paper.played, paper.spells_s[1:], strict=False) if level)


def kinds(statement: PowerStatement, row: int = 0) -> set[Kind]:
    return {note.kind for note in statement.rows[row].notes}


def test_an_ideal_clipper_delivers_what_the_closed_form_says() -> None:
    statement = stated(Paper())
    geometric_w = 10.0**2 / 8.0
    assert 0.993 < watts(statement, "onset") / geometric_w < 1.024  # −0.03 to +0.10 dB
    # closed form, hard-clipped sine and stiff supply: 1.0475 and 1.288 times; THD+N here is to the total
    assert watts(statement, "1 %") == pytest.approx(1.0475 * geometric_w, rel=5e-4, abs=0.0)
    assert watts(statement, "10 %") == pytest.approx(1.2889 * geometric_w, rel=5e-4, abs=0.0)
    assert all(point.held_s == 2.0 for point in statement.rows[0].points)


def test_without_a_hold_every_value_is_momentary() -> None:
    statement = stated(Paper(), attrs.evolve(PLAN, hold_s=0.0))
    assert [point.held_s for point in statement.rows[0].points] == [0.0, 0.0, 0.0]
    assert watts(statement, "1 %") == pytest.approx(1.0475 * 12.5, rel=2e-3, abs=0.0)


def test_an_own_point_and_a_fixed_onset_are_stated_too() -> None:
    statement = stated(Paper(), attrs.evolve(PLAN, own_thdn=0.03, onset_thdn=0.001))
    assert [point.at for point in statement.rows[0].points] == ["onset", "1 %", "3 %", "10 %"]
    # closed form, hard-clipped sine: 1.00782 times at 0.1 %, 1.11185 times at 3 %
    assert watts(statement, "onset") == pytest.approx(1.00782 * 12.5, rel=1e-3, abs=0.0)
    assert watts(statement, "3 %") == pytest.approx(1.11185 * 12.5, rel=1e-3, abs=0.0)


def test_the_drive_begins_at_minus_60_dbfs_and_never_rises_faster_than_stated() -> None:
    paper = Paper()
    stated(paper)
    first = next(level for level in paper.played if level)
    assert db(first) == pytest.approx(-60.0, rel=0.0, abs=1e-9)
    loud = [level for level in paper.played if level]
    assert max(db(after / before) for before, after in pairwise(loud)) <= 3.0 + 1e-9


def test_the_drive_never_passes_its_ceiling_and_a_point_beyond_it_says_why() -> None:
    paper = Paper(gain=10.0)  # 0.2 of full scale gives 4 V: far from clipping
    plan = attrs.evolve(PLAN, drive_vrms=0.4)
    statement = stated(paper, plan)
    ceiling_fs = 0.4 / FULL_SCALE_VRMS
    assert 0.995 * ceiling_fs < max(paper.played) <= ceiling_fs
    assert Kind.DRIVE_LIMIT_REACHED in kinds(statement)
    assert [point.power_w for point in statement.rows[0].points] == [None, None, None]
    why = [point.why.kind for point in statement.rows[0].points if point.why is not None]
    assert why == [Kind.ONSET_NOT_REACHED, Kind.NOT_CROSSED, Kind.NOT_CROSSED]


@pytest.mark.parametrize(("limit_vrms", "limit_w"), [(5.0, None), (None, 5.0**2 / 8.0), (10.1, 25.0 / 8.0)])
def test_the_search_stops_below_the_limits_that_a_person_sets(limit_vrms: float | None, limit_w: float | None) -> None:
    paper = Paper()
    statement = stated(paper, attrs.evolve(PLAN, limit_vrms=limit_vrms, limit_w=limit_w))
    assert max(paper.delivered(level)[0] for level in paper.played if level) < 5.0
    assert Kind.LIMIT_REACHED in kinds(statement)


def test_a_limit_of_distortion_ends_the_way_up_and_what_lies_below_is_still_held() -> None:
    statement = stated(Paper(), attrs.evolve(PLAN, limit_thdn=0.05))
    assert Kind.LIMIT_REACHED in kinds(statement)
    assert watts(statement, "1 %") == pytest.approx(1.0475 * 12.5, rel=5e-4, abs=0.0)
    ten = statement.rows[0].at("10 %")
    assert ten is not None
    assert ten.power_w is None


def test_every_question_is_put_in_silence() -> None:
    paper = Paper()
    stated(paper, attrs.evolve(PLAN, loads="8,4", channels="1,2"))
    assert {ask.action for ask, _ in paper.asked} == {Action.CONFIRM, Action.TURN, Action.SWITCH_LOAD}
    assert [level for _, level in paper.asked] == [0.0] * len(paper.asked)


def test_loads_and_channels_each_get_a_row_and_the_loads_a_ratio() -> None:
    statement = stated(Paper(), attrs.evolve(PLAN, loads="8,4", channels="1,2"))
    assert [(row.row.load.ohm, row.row.channel) for row in statement.rows] == [(8, 1), (8, 2), (4, 1), (4, 2)]
    assert Kind.LOAD_SEEN in kinds(statement, 2)  # 0.086 dB, at a damping factor of 100
    assert [(each.channel, each.at) for each in statement.ratios] == [
        (channel, at) for channel in (1, 2) for at in ("onset", "1 %", "10 %")
    ]
    assert statement.ratios[1].ratio.value == pytest.approx(2.0, rel=1e-3, abs=0.0)  # one rail, half the resistance


def test_a_load_whose_switch_changes_nothing_is_the_persons_word() -> None:
    statement = stated(Paper(output_ohm=0.0), attrs.evolve(PLAN, loads="8,4"))
    assert Kind.LOAD_STATED in kinds(statement, 1)


def test_all_channels_may_be_driven_together() -> None:
    paper = Paper()
    statement = stated(paper, attrs.evolve(PLAN, driven=Driven.ALL))
    assert statement.rows[0].row.driven == (1, 2)
    assert Kind.FLATTERS_ONE_CHANNEL not in kinds(statement)
    assert Kind.CHANNEL_STATED in kinds(statement)  # with both sounding neither is recognised


def test_an_amplifier_of_very_high_gain_is_carried_further_down() -> None:
    statement = stated(Paper(gain=700.0, noise_vrms=2e-4))
    assert 0.99 < watts(statement, "onset") / 12.5 < 1.03


def test_a_protection_that_trips_is_muted_and_said() -> None:
    paper = Paper(deaf_from_fs=0.1)
    with pytest.raises(StoppedError, match="protection"):
        stated(paper)
    assert paper.level_fs == 0.0
    assert [each.note.kind for each in paper.records if isinstance(each, Said)][-1] is Kind.PROTECTION
    assert any(isinstance(each, Kept) for each in paper.records)  # what was kept stays


def test_an_input_without_a_tone_is_not_driven_on() -> None:
    paper = Paper(gain=0.0)
    with pytest.raises(WattproofError, match="no tone arrives"):
        stated(paper)
    assert max(paper.played) <= from_db(-38.0)
    assert paper.level_fs == 0.0


def test_nothing_sounds_unless_load_and_limits_are_confirmed() -> None:
    paper = Paper(answer="no")
    with pytest.raises(StoppedError, match="not confirmed"):
        stated(paper)
    assert paper.played == []


def test_i_am_here_is_asked_for_while_parts_are_warm_and_its_absence_mutes() -> None:
    plan = attrs.evolve(PLAN, hold_s=300.0)
    stays = Paper()
    stated(stays, plan, rated_w=30.0)  # 12.5 W is above a quarter of it
    assert stays.prompts
    assert {ask.want for ask in stays.prompts} == {"here"}
    gone = Paper(answers_here=False)
    with pytest.raises(StoppedError, match="I am here"):
        stated(gone, plan, rated_w=30.0)
    assert gone.level_fs == 0.0
    assert gone.now / 1000.0 < PRESENCE_S + 60.0


def test_cold_parts_need_nobody() -> None:
    paper = Paper(answers_here=False)
    stated(paper, attrs.evolve(PLAN, hold_s=300.0), rated_w=400.0)
    assert paper.prompts == []


def test_a_load_that_would_pass_its_rating_is_not_held() -> None:
    paper = Paper()
    statement = stated(paper, attrs.evolve(PLAN, hold_s=300.0), rated_w=8.0)
    assert Kind.HEAT_REACHED in kinds(statement)
    assert not any(isinstance(each, Kept) and each.mark and each.mark.role is Role.HELD for each in paper.records)


def test_time_above_the_rating_mutes() -> None:
    statement = stated(Paper(), attrs.evolve(PLAN, limit_over_s=1.0), rated_w=8.0)
    assert Kind.LIMIT_REACHED in kinds(statement)


def test_an_unknown_rating_is_said() -> None:
    assert Kind.NO_RATING in kinds(stated(Paper(), rated_w=None))


def test_bursts_are_short_rare_and_end_at_one_per_cent() -> None:
    paper = Paper()
    plan = attrs.evolve(PLAN, frequency_hz=10_000.0, bursts=True)
    statement = stated(paper, plan)
    assert [point.at for point in statement.rows[0].points] == ["onset", "1 %"]
    assert statement.rows[0].points[1].held_s == 0.0
    assert Kind.BURSTS in kinds(statement)
    assert all(level == 0.0 for level in paper.played[::2])  # silence before and after each
    assert longest_burst_s(paper) <= BURST_S
    loud_s = sum(spell for level, spell in zip(paper.played, paper.spells_s[1:], strict=False) if level)
    assert loud_s <= 1.001 * BURST_DUTY * paper.now / 1000.0
    assert max(paper.delivered(level)[1] for level in paper.played if level) < 0.05


def test_a_valve_amplifier_never_runs_without_a_load() -> None:
    with pytest.raises(WrongUseError, match="valve"):
        stated(Paper(), attrs.evolve(PLAN, loads="1000000", valve=True))


def test_without_volts_there_is_no_power() -> None:
    paper = Paper()
    place = attrs.evolve(paper.place(), calibration=type(paper.place().calibration)())
    with pytest.raises(WrongUseError, match="full-scale-vrms"):
        paper.run(power(attrs.evolve(PLAN, full_scale_vrms=None), place))
    assert paper.played == []


def test_a_channel_that_the_rig_does_not_wire_is_asked_for() -> None:
    paper = Paper()
    one = attrs.evolve(paper.place(), rig=Rig("one", paper.place().rig.wirings[:1]))
    paper.run(power(attrs.evolve(PLAN, channels="1,2"), one))
    assert Action.SWITCH_CHANNEL in {ask.action for ask, _ in paper.asked}


def test_progress_never_runs_backwards_far_and_says_what_is_done() -> None:
    paper = Paper()
    stated(paper)
    shares = [each.share for each in paper.progress]
    assert shares == sorted(shares)
    assert {each.doing.kind for each in paper.progress} == {Kind.RAISING, Kind.LOOKING_CLOSER, Kind.HOLDING}
    assert shares[-1] > 0.5


def test_a_run_that_was_cut_short_concludes_from_what_it_kept() -> None:
    paper = Paper()
    place = paper.place()
    paper.run(power(PLAN, place), until=lambda each: len(each.records) > 12)
    statement = conclude(PLAN, rows_of(PLAN, place), paper.records)
    assert statement.rows[0].points[0].why is not None
    assert len(statement.curve) > 5
    assert conclude(PLAN, rows_of(PLAN, place), []).rows == ()
