"""The attenuator's JSON document keeps its contract."""

import json
import re
from typing import Any

import attrs
import pytest

from tests.dsp.attenuators import bridge_24_v, into_8_ohm
from wattproof.dsp.attenuator import Plan, plan
from wattproof.report import attenuator_document as contract
from wattproof.report.attenuator_document import attenuator_document
from wattproof.report.reading_document import json_text

KEYS = [
    "wattproof", "version", "topology", "settings", "parts", "ratio", "ratio_least", "ratio_greatest", "ratio_95",
    "ratio_budget", "full_power", "input", "noise", "bridge", "clamp", "faults", "verdict", "warnings", "assumptions",
]  # fmt: skip


def changed(made: Plan, **fields: Any) -> Plan:  # noqa: ANN401 - the fields of a value
    return plan(attrs.evolve(made.wish, **fields))


def parsed(made: Plan) -> dict[str, Any]:
    text = json_text(attenuator_document(made))
    assert text.isascii()
    return dict(json.loads(text, parse_constant=pytest.fail))


def keys_of(value: object) -> set[str]:
    if isinstance(value, dict):
        return set(value) | {key for inner in value.values() for key in keys_of(inner)}
    return {key for inner in value for key in keys_of(inner)} if isinstance(value, list) else set()


def test_a_single_ended_plan_has_the_keys_of_the_contract() -> None:
    document = parsed(into_8_ohm())
    assert list(document) == KEYS
    assert (document["wattproof"], document["version"], document["topology"]) == ("attenuator", 1, "single-ended")
    assert [part["name"] for part in document["parts"]] == ["R1a", "R1b", "R2a", "R2b"]
    assert {part["leg"] for part in document["parts"]} == {None}
    assert document["bridge"] is None
    assert document["clamp"] is None
    assert document["settings"]["rail_v"] == 45.0
    assert document["settings"]["tolerance"] == 0.01
    assert document["ratio_least"] < document["ratio_95"][0] < document["ratio"]["value"]
    assert document["ratio"]["value"] < document["ratio_95"][1] < document["ratio_greatest"]


def test_a_bridge_lists_the_parts_of_both_legs() -> None:
    document = parsed(bridge_24_v())
    assert document["topology"] == "bridge-tied"
    assert [(part["leg"], part["name"]) for part in document["parts"]] == [
        (leg, name) for leg in "+-" for name in ("R1a", "R1b", "R2a", "R2b")
    ]
    assert document["bridge"]["rejection"]["worst_db"] == pytest.approx(48.6, rel=0, abs=0.05)
    assert document["bridge"]["rejection_of_1_percent_parts"]["worst_db"] == pytest.approx(28.6, rel=0, abs=0.05)
    assert all(fault["harmless"] for fault in document["faults"])


def test_two_inputs_see_half_each() -> None:
    document = parsed(changed(bridge_24_v(), two_inputs=True))
    assert document["topology"] == "bridge-tied to two inputs"
    seen = document["full_power"]["output_vrms"] / 2.0 / document["ratio"]["value"]
    assert document["full_power"]["level_vrms"] == pytest.approx(seen, rel=1e-12, abs=0)


def test_a_clamp_has_its_capacitance_and_its_distortion_at_1_and_20_khz() -> None:
    clamp = parsed(changed(into_8_ohm(), clamp_pf=20.0))["clamp"]
    assert clamp["capacitance_pf"] == 20.0
    assert [entry["frequency_hz"] for entry in clamp["distortion"]] == [1000.0, 20000.0]
    assert clamp["distortion"][1]["ratio"] == pytest.approx(20.0 * clamp["distortion"][0]["ratio"], rel=1e-9, abs=0)


def test_what_is_unlimited_is_null() -> None:
    document = parsed(changed(bridge_24_v(), cable_pf=0.0, common_mode_vrms=0.0))
    assert document["input"]["bandwidth_hz"] is None
    assert document["bridge"]["hum"]["worst_db"] is None


def test_every_key_is_in_the_contract() -> None:
    named = set(re.findall(r'"(\w+)"', contract.__doc__ or ""))
    shown = parsed(changed(bridge_24_v(), clamp_pf=20.0))
    assert keys_of(shown) - named - {"value", "u", "unit"} == set()


def test_every_sentence_with_a_figure_says_what_the_figure_rests_on() -> None:
    for made in (into_8_ohm(), bridge_24_v(), changed(bridge_24_v(), tolerance=0.01, rail_v=None)):
        document = parsed(made)
        for caution in [document["verdict"], *document["warnings"], *document["assumptions"]]:
            names_left_out = re.sub(r"\bR[12]\w*", "", caution["text"])
            assert caution["basis"] or not re.search(r"\d", names_left_out), caution
