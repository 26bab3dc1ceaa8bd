"""What a statement says of a claim, of flattering practices and of published conditions."""

import attrs
import pytest

from tests.procedures.paper_amplifier import Paper
from wattproof.core.notes import Kind, Note
from wattproof.core.wording import sentence
from wattproof.procedures.power_plan import Driven, Preset, StepsPlan
from wattproof.procedures.power_rows import rows_of
from wattproof.procedures.power_steps import power
from wattproof.procedures.presets import UNVERIFIED, Tick
from wattproof.procedures.requests import Kept, Role
from wattproof.procedures.statement import PowerStatement, conclude

PLAN = StepsPlan(full_scale_vrms=40.0, hold_s=1.0)  # an onset at 12.5 W, 13.1 W at 1 % and 16.1 W at 10 %


def stated(plan: StepsPlan, paper: Paper | None = None) -> PowerStatement:
    paper = paper or Paper()
    place = paper.place()
    paper.run(power(plan, place))
    return conclude(plan, rows_of(plan, place), paper.records)


def noted(plan: StepsPlan, kind: Kind) -> dict[str, float | str] | None:
    found = [note for note in stated(plan).rows[0].notes if note.kind is kind]
    return dict(found[0].values) if found else None


@pytest.mark.parametrize(
    ("claimed_w", "kind"),
    [
        (10.0, Kind.CLAIM_MET),
        (15.0, Kind.CLAIM_AT_MORE),
        (20.0, Kind.CLAIM_MISSED),
        (26.0, Kind.CLAIM_IMPOSSIBLE),  # a square wave between the same rails gives 25 W: twice the onset, closed form
    ],
)
def test_a_claim_is_met_met_at_more_missed_or_impossible(claimed_w: float, kind: Kind) -> None:
    said = [note.kind for note in stated(attrs.evolve(PLAN, claimed_w=claimed_w)).rows[0].notes]
    claims = {Kind.CLAIM_MET, Kind.CLAIM_AT_MORE, Kind.CLAIM_MISSED, Kind.CLAIM_IMPOSSIBLE}
    assert claims & set(said) == {kind}


def test_what_a_claim_takes_is_stated_in_volts() -> None:
    values = noted(attrs.evolve(PLAN, claimed_w=20.0), Kind.CLAIM_MISSED)
    assert values is not None
    assert values["vrms"] == pytest.approx((20.0 * 8.0) ** 0.5, rel=1e-12, abs=0.0)


def test_peak_watts_look_like_peak_watts() -> None:
    assert noted(attrs.evolve(PLAN, claimed_w=26.2), Kind.FLATTERS_PEAK) is not None  # twice the power at 1 %
    assert noted(attrs.evolve(PLAN, claimed_w=50.0), Kind.FLATTERS_PEAK) is None


def test_a_claim_at_a_higher_supply_is_pointed_out() -> None:
    plan = attrs.evolve(PLAN, claimed_w=18.9, supply_v=12.0)
    values = noted(plan, Kind.FLATTERS_SUPPLY)
    assert values is not None
    assert values["needed_v"] == pytest.approx(12.0 * (18.9 / 13.1) ** 0.5, rel=0.01, abs=0.0)  # swing goes with supply
    named = noted(attrs.evolve(plan, claimed_supply_v=14.4), Kind.FLATTERS_SUPPLY)
    assert named is not None
    assert named["needed_v"] == 14.4


def test_ten_per_cent_and_one_channel_are_said_to_flatter() -> None:
    said = {note.kind for note in stated(PLAN).rows[0].notes}
    assert {Kind.FLATTERS_TEN_PER_CENT, Kind.FLATTERS_ONE_CHANNEL} <= said
    assert Kind.FLATTERS_MOMENTARY not in said  # the supply on paper is stiff


def test_momentary_power_that_falls_once_held_is_said_to_flatter() -> None:
    paper = Paper()
    place = paper.place()
    paper.run(power(PLAN, place))
    # the same run, its held readings 3 % lower in voltage, as on a supply that sags
    records = [_sagged(each) if isinstance(each, Kept) else each for each in paper.records]
    statement = conclude(PLAN, rows_of(PLAN, place), records)
    said = [note for note in statement.rows[0].notes if note.kind is Kind.FLATTERS_MOMENTARY]
    assert len(said) == 3
    assert dict(said[1].values)["ratio"] == pytest.approx(1.03**2, rel=1e-3, abs=0.0)
    one = statement.rows[0].at("1 %")
    assert one is not None
    assert one.voltage_vrms is not None
    assert one.momentary_vrms is not None
    assert one.momentary_vrms.value / one.voltage_vrms.value == pytest.approx(1.03, rel=1e-3, abs=0.0)


def _sagged(kept: Kept) -> Kept:
    reading = kept.reading
    if kept.mark is None or kept.mark.role is not Role.HELD or reading.level_vrms is None or reading.power_w is None:
        return kept
    volts, watts = reading.level_vrms.scaled(1 / 1.03, "V"), reading.power_w.scaled(1 / 1.03**2, "W")
    return attrs.evolve(kept, reading=attrs.evolve(reading, level_vrms=volts, power_w=watts))


@pytest.mark.parametrize("preset", [Preset.FTC, Preset.IEC])
def test_a_preset_lists_its_conditions_unverified_and_claims_nothing(preset: Preset) -> None:
    statement = stated(attrs.evolve(PLAN, preset=preset))
    assert len(statement.conditions) >= 6
    assert all(each.read or each.remark == UNVERIFIED for each in statement.conditions)
    assert {each.tick for each in statement.conditions} >= {Tick.NOT_DONE, Tick.NOT_SEEN}
    assert not any("conform" in each.asks.lower() for each in statement.conditions)


def test_a_condition_is_ticked_off_once_it_is_kept() -> None:
    short = stated(attrs.evolve(PLAN, preset=Preset.IEC))
    long = stated(attrs.evolve(PLAN, preset=Preset.IEC, hold_s=60.0, supply_v=24.0, driven=Driven.ALL))
    assert (
        sum(each.tick is Tick.DONE for each in long.conditions)
        >= sum(each.tick is Tick.DONE for each in short.conditions) + 3
    )


def test_no_preset_lists_nothing() -> None:
    assert stated(PLAN).conditions == ()


def test_every_note_of_a_statement_has_its_sentence() -> None:
    plan = attrs.evolve(PLAN, loads="8,4", claimed_w=30.0, supply_v=12.0)
    notes: list[Note] = [note for row in stated(plan).rows for note in row.notes]
    assert all(sentence(note) for note in notes)
