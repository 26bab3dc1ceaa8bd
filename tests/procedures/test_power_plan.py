"""The settings of a power statement: lists, points, bursts, and what is refused with a line that says why."""

from typing import Any

import attrs
import pytest

from wattproof.core.fields import fields_of
from wattproof.procedures.power_plan import HandPlan, PowerPlan, Preset, StepsPlan
from wattproof.procedures.presets import FTC_HOLD_S, IEC_HOLD_S, preset_plan


def test_the_points_are_onset_one_ten_and_ones_own() -> None:
    assert [target.name for target in PowerPlan().targets] == ["onset", "1 %", "10 %"]
    own = PowerPlan(own_thdn=0.003, onset_thdn=0.0005)
    assert [(target.name, target.thdn) for target in own.targets] == [
        ("onset", 0.0005),
        ("0.3 %", 0.003),
        ("1 %", 0.01),
        ("10 %", 0.1),
    ]
    assert own.stop_thdn == 0.1
    assert PowerPlan(own_thdn=0.2).stop_thdn == 0.2


def test_lists_are_read_in_order() -> None:
    plan = PowerPlan(loads="8, 4,2.7", channels="2,1")
    assert plan.loads_ohm == (8.0, 4.0, 2.7)
    assert plan.channel_list == (2, 1)


@pytest.mark.parametrize(
    ("wrong", "said"),
    [
        ({"loads": "eight"}, "loads"),
        ({"loads": "8,8"}, "each once"),
        ({"loads": "-8"}, "loads"),
        ({"loads": "nan"}, "loads"),
        ({"channels": "0"}, "channels"),
        ({"channels": "1.5"}, "channels"),
        ({"channels": ""}, "channels"),
        ({"low_hz": 5000.0, "high_hz": 400.0}, "band"),
        ({"frequency_hz": 10_000.0}, "bursts"),
        ({"frequency_hz": 30.0}, "bursts"),
        ({"hold_s": -1.0}, "hold"),
        ({"rise_db_per_s": 100.0}, "rise"),
    ],
)
def test_what_makes_no_sense_is_refused(wrong: dict[str, Any], said: str) -> None:
    with pytest.raises(ValueError, match=said):
        PowerPlan(**wrong)


def test_bursts_look_no_further_than_one_per_cent() -> None:
    plan = PowerPlan(frequency_hz=10_000.0, bursts=True, own_thdn=0.05)
    assert plan.in_bursts
    assert plan.stop_thdn == 0.01
    assert not PowerPlan(bursts=True).in_bursts


@pytest.mark.parametrize("kind", [StepsPlan, HandPlan])
def test_every_setting_is_declared_with_its_help(kind: type[PowerPlan]) -> None:
    declared = {field.name for field in fields_of(kind)}
    assert declared == {field.name for field in attrs.fields(kind)}
    assert all(field.label and field.help for field in fields_of(kind))


def test_a_preset_holds_as_long_as_its_rule_asks() -> None:
    assert preset_plan(PowerPlan(preset=Preset.FTC)).hold_s == FTC_HOLD_S
    assert preset_plan(PowerPlan(preset=Preset.IEC)).hold_s == IEC_HOLD_S
    assert preset_plan(PowerPlan(preset=Preset.IEC, hold_s=600.0)).hold_s == 600.0
    assert preset_plan(PowerPlan()) == PowerPlan()
