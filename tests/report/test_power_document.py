"""The JSON of a power statement keeps its contract: keys, kinds, and what a point without a value says."""

import json
import math

import attrs
import pytest

from tests.procedures.paper_amplifier import Paper
from wattproof.core.run import Ending
from wattproof.procedures.power_plan import Preset, StepsPlan
from wattproof.procedures.power_rows import rows_of
from wattproof.procedures.power_steps import power
from wattproof.procedures.statement import PowerStatement, conclude
from wattproof.report.power_document import power_document
from wattproof.report.reading_document import json_text

PLAN = StepsPlan(full_scale_vrms=40.0, hold_s=1.0, loads="8,4", claimed_w=50.0, supply_v=15.0, preset=Preset.FTC)


def stated(plan: StepsPlan = PLAN, paper: Paper | None = None) -> PowerStatement:
    paper = paper or Paper()
    place = paper.place()
    paper.run(power(plan, place))
    return conclude(plan, rows_of(plan, place), paper.records)


def document(statement: PowerStatement, ending: Ending = Ending.DONE, why: str = "") -> dict[str, object]:
    text = json_text(power_document(statement, Paper().place().rig, ending, why))
    assert text.isascii()
    made: dict[str, object] = json.loads(text)
    return made


def is_q(value: object) -> bool:
    return (
        isinstance(value, dict)
        and set(value) == {"value", "u", "unit"}
        and math.isfinite(value["value"])
        and value["u"] >= 0.0
        and isinstance(value["unit"], str)
    )


def test_the_keys_are_those_of_the_contract() -> None:
    made = document(stated())
    head = {"wattproof", "version", "settings", "rig", "ending", "why", "statement", "ratios", "conditions"}
    assert set(made) == head | {"curve", "notes"}
    assert (made["wattproof"], made["version"], made["ending"], made["why"]) == ("power", 1, "done", "")
    assert isinstance(made["settings"], dict)
    assert set(made["settings"]) == {field.name for field in attrs.fields(StepsPlan)}


def test_a_row_has_its_points_with_quantities() -> None:
    rows = document(stated())["statement"]
    assert isinstance(rows, list)
    assert [(row["channel"], row["load_ohm"], row["driven"]) for row in rows] == [(1, 8.0, [1]), (1, 4.0, [1])]
    for row in rows:
        assert (row["claimed_w"], row["supply_v"]) == (50.0, 15.0)
        assert [point["at"] for point in row["points"]] == ["onset", "1 %", "10 %"]
        for point in row["points"]:
            quantities = [point[name] for name in ("voltage_vrms", "power_w", "thdn", "momentary_vrms", "momentary_w")]
            assert all(is_q(each) for each in quantities)
            assert [each["unit"] for each in quantities] == ["V", "W", "1", "V", "W"]
            assert (point["held_s"], point["why"]) == (1.0, None)


def test_a_point_that_cannot_be_reached_is_null_and_says_why() -> None:
    rows = document(stated(attrs.evolve(PLAN, loads="8", drive_vrms=0.1)))["statement"]
    assert isinstance(rows, list)
    for point in rows[0]["points"]:
        assert (point["voltage_vrms"], point["power_w"], point["thdn"], point["held_s"]) == (None, None, None, 0.0)
        assert isinstance(point["why"], str)
        assert point["why"]


def test_the_curve_holds_every_kept_reading_in_order() -> None:
    curve = document(stated())["curve"]
    assert isinstance(curve, list)
    assert len(curve) > 40
    keys = {"row", "stroke", "at_s", "drive_dbfs", "voltage_vrms", "power_w", "thdn", "thd", "noise", "dominated"}
    assert all(set(each) == keys | {"left_out"} for each in curve)
    assert {each["dominated"] for each in curve} == {"noise", "harmonics"}
    assert [each["at_s"] for each in curve] == sorted(each["at_s"] for each in curve)


def test_ratios_and_conditions_are_there() -> None:
    made = document(stated())
    assert isinstance(made["ratios"], list)
    assert [each["at"] for each in made["ratios"]] == ["onset", "1 %", "10 %"]
    assert all(is_q(each["power_ratio"]) and each["over_ohm"] < each["under_ohm"] for each in made["ratios"])
    assert isinstance(made["conditions"], list)
    assert {each["tick"] for each in made["conditions"]} <= {"done", "not done", "cannot be seen by the program"}
    assert all(each["remark"] == "unverified, read the text" for each in made["conditions"])


def test_notes_are_sentences_each_once() -> None:
    notes = document(stated())["notes"]
    assert isinstance(notes, list)
    assert len(notes) == len(set(notes)) > 4
    assert not any("conform" in note.lower() for note in notes)


@pytest.mark.parametrize("ending", [Ending.STOPPED, Ending.FAILED])
def test_an_early_ending_says_so(ending: Ending) -> None:
    made = document(conclude(PLAN, rows_of(PLAN, Paper().place()), []), ending, "the device vanished")
    assert (made["ending"], made["why"], made["statement"]) == (ending.value, "the device vanished", [])
