"""The attenuator's page and drawing say what a person must know, and draw what was planned."""

import re
import xml.etree.ElementTree as ET

import attrs
import pytest

from tests.dsp.attenuators import bridge_24_v, into_8_ohm
from wattproof.dsp.attenuator import Plan, plan
from wattproof.report.attenuator_svg import circuit_svg
from wattproof.report.attenuator_table import attenuator_table

SVG = "{http://www.w3.org/2000/svg}"
PLANS = {
    "single-ended": into_8_ohm(),
    "bridge-tied": bridge_24_v(),
    "two inputs": plan(attrs.evolve(bridge_24_v().wish, two_inputs=True)),
}


def words(text: str) -> str:
    return " ".join(text.split())


@pytest.mark.parametrize("made", PLANS.values(), ids=PLANS)
def test_the_warnings_stand_before_the_circuit(made: Plan) -> None:
    page = attenuator_table(made)
    warned, rest = page.split("\nCircuit\n")
    told = words(warned)
    for said in (
        "Switch phantom power off",
        "put 1 kΩ between the amplifier's common and the interface's ground and measure across it, AC and DC",
        "Above 0.5 V, stop",
        "[common practice, no source]",
        "A mains-powered computer earths the interface",
        "A chassis tied to the mains must never be connected",
        "The drive cable already joins the amplifier's ground to the interface's",
        "hot enough to burn",
        "licensed practice and local rules",
    ):
        assert said in told
    assert "No single part, open or short, puts the amplifier's output on the input" in words(rest)


@pytest.mark.parametrize("name", ["bridge-tied", "two inputs"])
def test_a_bridge_s_danger_comes_first(name: str) -> None:
    told = words(attenuator_table(PLANS[name]).split("\nCircuit\n")[0])
    assert "neither output terminal is ground. Both sit near half the supply, some 12.0 V" in told
    assert "oscilloscope can destroy the amplifier" in told
    assert told.index("Bridge-tied: neither") < told.index("phantom")


def test_a_single_ended_plan_asks_whether_it_is_one() -> None:
    assert "where neither terminal is ground" in words(attenuator_table(into_8_ohm()))


def test_an_unstated_rail_is_a_warning() -> None:
    unstated = plan(attrs.evolve(into_8_ohm().wish, rail_v=None))
    assert "holds up to 40.0 V, the least that the power needs" in words(attenuator_table(unstated))
    assert "holds up to" not in words(attenuator_table(into_8_ohm()))


def test_coarse_parts_on_a_bridge_are_a_warning() -> None:
    coarse = plan(attrs.evolve(bridge_24_v().wish, tolerance=0.01))
    assert "Parts of 1 % keep out only 29 dB" in words(attenuator_table(coarse))


def test_what_was_stated_is_told_from_what_is_usual() -> None:
    usual = words(attenuator_table(into_8_ohm()))
    stated = words(attenuator_table(plan(attrs.evolve(into_8_ohm().wish, cable_pf=150.0))))
    assert "Cable 300 pF from each pin to ground, of some 100 pF a metre [common practice, no source]" in usual
    assert "Cable 150 pF from each pin to ground, of some 100 pF a metre [as stated]" in stated
    assert "Rail 45.0 V [as stated]" in usual


def test_a_dangerous_voltage_is_a_warning() -> None:
    loud = plan(attrs.evolve(into_8_ohm().wish, power_w=1000.0, rail_v=150.0))
    told = words(attenuator_table(loud))
    assert "above 50 V AC or 120 V DC a touch can kill. Cover every terminal. [IEC 61140, unverified" in told
    assert "a touch can kill" not in attenuator_table(into_8_ohm())


@pytest.mark.parametrize("made", PLANS.values(), ids=PLANS)
def test_lines_are_as_wide_as_they_may_be(made: Plan) -> None:
    page = attenuator_table(made, width=88)
    assert max(len(line) for line in page.splitlines()) <= 88
    assert page.endswith("\n")


@pytest.mark.parametrize("made", PLANS.values(), ids=PLANS)
def test_a_plain_terminal_gets_plain_characters(made: Plan) -> None:
    page = attenuator_table(made, ascii_only=True)
    assert page.isascii()
    assert "\\u" not in page


def test_the_drawn_wires_meet_in_characters() -> None:
    lines = attenuator_table(bridge_24_v()).split("Circuit\n")[1].splitlines()[1:10]
    columns = [{k for k, char in enumerate(line) if char in "|+"} for line in lines]
    junctions = [lines[0].index("+--"), lines[0].rindex("+---o") - 8, lines[0].rindex("+---o")]
    assert all(set(junctions[1:]) <= found or "[R2a]" in line for line, found in zip(lines, columns, strict=True))
    for line in lines:
        if "[R2a]" in line:
            assert line.index("[R2a]") + 2 == junctions[1]
            assert line.index("[R2b]") + 2 == junctions[2]


@pytest.mark.parametrize(
    ("name", "resistors", "grounds"), [("single-ended", 5, 2), ("bridge-tied", 9, 1), ("two inputs", 9, 1)]
)
def test_the_drawing_has_a_rectangle_for_each_resistor(name: str, resistors: int, grounds: int) -> None:
    drawn = ET.fromstring(circuit_svg(PLANS[name]))  # noqa: S314 - our own text
    bodies = [shape for shape in drawn.iter(f"{SVG}rect") if shape.get("stroke")]
    texts = [text.text or "" for text in drawn.iter(f"{SVG}text")]
    assert len(bodies) == resistors  # IEC 60617: a resistor is a rectangle, three times as long as it is wide
    assert {max(size) / min(size) for size in map(sides, bodies)} == {3.0}
    assert texts.count("ground") == grounds
    assert ("neither terminal is ground" in texts) == (name != "single-ended")
    assert drawn.find(f"{SVG}title") is not None
    assert drawn.find(f"{SVG}desc") is not None


def sides(body: ET.Element) -> tuple[float, float]:
    return float(body.get("width", "")), float(body.get("height", ""))


@pytest.mark.parametrize("made", PLANS.values(), ids=PLANS)
def test_the_drawing_names_each_value_and_keeps_within_its_sheet(made: Plan) -> None:
    drawn = ET.fromstring(circuit_svg(made))  # noqa: S314 - our own text
    texts = [text.text or "" for text in drawn.iter(f"{SVG}text")]
    upper, lower = made.leg.upper_ohm[0] / 1e3, made.leg.lower_ohm[0] / 1e3
    assert any(text.startswith("R1a") and f"{upper:g} kΩ" in text for text in texts)
    assert f"{lower:g} kΩ" in texts
    width, height = (float(number) for number in drawn.get("viewBox", "").split()[2:])
    for text in drawn.iter(f"{SVG}text"):
        assert 0 < float(text.get("x", "")) < width
        assert 0 < float(text.get("y", "")) < height
    rows = sorted(
        float(text.get("y", "")) for text in drawn.iter(f"{SVG}text") if re.match("out|Ratio", text.text or "")
    )
    assert rows[-1] - rows[-2] > 16  # the caption keeps clear of the lowest terminal's name
