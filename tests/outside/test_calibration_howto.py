"""The how-to in calibration/ is worked right to the last digit, and the program says the same."""

import ast
import math
import operator
import re
from collections.abc import Callable
from decimal import Decimal
from typing import Any

import attrs
import pytest

from tests.dsp.attenuators import bridge_24_v, into_8_ohm
from tests.house.sources import ROOT
from wattproof.core.rounding import stated
from wattproof.core.units import db
from wattproof.dsp.attenuator_bridge import common_mode, rejection
from wattproof.dsp.attenuator_faults import faults
from wattproof.dsp.intervals import budget, rectangular
from wattproof.dsp.uncertainty import known, power, product, ratio

TEXT = (ROOT / "calibration" / "README.md").read_text(encoding="utf-8")
LINE = re.compile(r"(?P<said>.{22,24}?)(?P<name>\w+) = (?P<formula>.+) = (?P<value>[-−]?[\d.]+)(?: (?P<unit>\S+))?$")
OPERATORS: dict[type[ast.AST], Callable[..., float]] = {
    ast.Add: operator.add,
    ast.Sub: operator.sub,
    ast.Mult: operator.mul,
    ast.Div: operator.truediv,
    ast.Pow: operator.pow,
    ast.USub: operator.neg,
}
FUNCTIONS: dict[str, Callable[[float], float]] = {"sqrt": math.sqrt, "lg": math.log10}


@attrs.frozen
class Worked:
    """One line of a worked box."""

    name: str
    formula: str
    value: Decimal
    unit: str


def boxes() -> list[str]:
    return re.findall(r"```worked\n(.+?)```", TEXT, flags=re.DOTALL)


def lines() -> list[Worked]:
    found = []
    for row in "".join(boxes()).splitlines():
        match = LINE.match(row)
        assert match, f"no worked line: {row}"
        found.append(Worked(match["name"], match["formula"], Decimal(match["value"]), match["unit"] or ""))
    return found


def computed(node: ast.AST, known_values: dict[str, float]) -> float:
    """Return the value of an arithmetic expression; nothing but numbers, names above it, + − · / ^ sqrt lg."""
    match node:
        case ast.Expression(body):
            return computed(body, known_values)
        case ast.Constant(int() | float() as number):
            return float(number)
        case ast.Name(name):
            return known_values[name]
        case ast.BinOp(left, operation, right):
            return OPERATORS[type(operation)](computed(left, known_values), computed(right, known_values))
        case ast.UnaryOp(operation, operand):
            return OPERATORS[type(operation)](computed(operand, known_values))
        case ast.Call(ast.Name(name), [argument], []):
            return FUNCTIONS[name](computed(argument, known_values))
    raise AssertionError(f"no arithmetic: {ast.dump(node)}")


def worked() -> dict[str, float]:
    return {line.name: float(line.value) for line in lines()}


def test_every_line_follows_from_those_above_it() -> None:
    above: dict[str, float] = {}
    for line in lines():
        exact = computed(ast.parse(line.formula.replace("^", "**"), mode="eval"), above)
        place = Decimal(1).scaleb(int(line.value.as_tuple().exponent))
        rounded = Decimal(repr(exact)).quantize(place)
        assert rounded == line.value, f"{line.name} = {line.formula} is {exact}"
        assert line.name not in above
        above[line.name] = float(line.value)


def test_there_is_something_to_check_and_a_wrong_digit_would_be_seen() -> None:
    assert len(boxes()) >= 10
    assert len(lines()) >= 50
    assert computed(ast.parse("sqrt(2)**2 - lg(100)", mode="eval"), {}) == pytest.approx(0.0, rel=0, abs=1e-12)


def test_the_planner_proposes_the_parts_that_are_worked_with() -> None:
    plan, seen = into_8_ohm(), worked()
    assert f"R1 = {plan.leg.upper_ohm[0]:.0f} Ω + {plan.leg.upper_ohm[1]:.0f} Ω, of {plan.parts[0].rated_w:g} W" in TEXT
    assert f"R2 = {plan.leg.lower_ohm[0]:.0f} Ω ∥ {plan.leg.lower_ohm[1]:.0f} Ω" in TEXT
    # the digits that are printed
    assert plan.wish.full_vrms == pytest.approx(seen["U"], rel=0, abs=5e-4)
    assert plan.leg.ratio == pytest.approx(seen["N"], rel=0, abs=5e-4)
    assert plan.level_vrms == pytest.approx(seen["E"], rel=0, abs=1e-4)
    assert db(plan.headroom) == pytest.approx(seen["H"], rel=0, abs=5e-3)
    assert plan.parts[0].running_w == pytest.approx(seen["W"], rel=0, abs=5e-5)
    worst = max(faults(plan), key=lambda fault: fault.pin_v)
    assert worst.pin_v == pytest.approx(seen["F"], rel=0, abs=5e-4)
    assert worst.limit_v == pytest.approx(seen["G"], rel=0, abs=5e-4)
    assert worst.shorted_ma == pytest.approx(seen["K"], rel=0, abs=5e-4)
    assert plan.parts[0].fault_w == pytest.approx(seen["M"], rel=0, abs=5e-4)
    least, greatest = plan.extremes()
    assert f"({least:.3f} to {greatest:.3f}\nhere)" in TEXT
    assert f"16.542 to within {100 * plan.ratio().u / plan.ratio().value:.2f} %" in TEXT


def test_the_uncertainty_arithmetic_gives_the_watts_that_are_worked() -> None:
    seen = worked()
    level = known(seen["S"], "V", "level calibration", seen["S"] * rectangular(seen["aS"] / seen["m"]))
    tap = known(seen["n"], "1", "attenuator", seen["n"] * rectangular(10 ** (0.02 / 20) - 1))
    volt = known(8.101, "V", "voltmeter", rectangular(seen["aV"]))
    ampere = known(1.003, "A", "ammeter", rectangular(seen["aI"]))
    at_load = product(level, tap, "V").scaled(10 ** (-7.42 / 20), "V")
    watts = ratio(power(at_load, 2.0, "V²"), ratio(volt, ampere, "Ω"), "W")
    assert stated(watts) == "98.2 ± 1.5 W"
    assert "**98.2 W ± 1.5 W**" in TEXT
    assert watts.u == pytest.approx(seen["UP"] / 1.96, rel=0, abs=5e-3)
    shares = {row.source: row.share for row in budget(watts)}
    assert shares["level calibration"] == pytest.approx(seen["sS"] / 100, rel=0, abs=5e-3)
    assert shares["attenuator"] == pytest.approx(seen["sn"] / 100, rel=0, abs=5e-3)
    assert shares["voltmeter"] + shares["ammeter"] == pytest.approx(seen["sR"] / 100, rel=0, abs=5e-3)


def test_the_bridge_is_planned_as_it_is_worked() -> None:
    plan, seen = bridge_24_v(), worked()
    assert f"R1 = {plan.leg.upper_ohm[0]:.0f} Ω + {plan.leg.upper_ohm[1]:.0f} Ω and R2 = 1270 Ω ∥ 1270 Ω" in TEXT
    assert plan.leg.ratio == pytest.approx(seen["Nb"], rel=0, abs=1e-4)  # through a rounded L
    assert plan.level_vrms == pytest.approx(seen["Eb"], rel=0, abs=1e-4)
    told = common_mode(plan)
    assert told.running_v == pytest.approx(seen["c1"], rel=0, abs=5e-4)
    assert told.stuck_v == pytest.approx(seen["c2"], rel=0, abs=5e-4)
    for tolerance, worst, standard in ((0.001, "z1", "z2"), (0.01, "z3", "z4")):
        kept = rejection(plan, tolerance)
        assert db(kept.worst) == pytest.approx(seen[worst], rel=0, abs=0.02)  # 4kt leaves out terms in t²
        assert db(kept.standard) == pytest.approx(seen[standard], rel=0, abs=0.01)
    assert 1e3 * rejection(plan).hum_worst_vrms == pytest.approx(seen["h1"], rel=0, abs=1e-3)


@pytest.mark.parametrize(
    "said",
    [
        "can destroy the amplifier",
        "licensed practice and local rules",
        "burns skin",
        "Phantom power off",
        "put 1 kΩ between the amplifier's common and the interface's ground and measure across it, AC and DC",
        "Above 0.5 V, stop and find out why (common practice, no source)",
        "A mains-powered computer earths the interface",
        "tied to the mains must never be connected",
        "the drive cable already joins",
    ],
)
def test_the_dangers_are_said(said: str) -> None:
    assert said in " ".join(TEXT.split())


def test_the_commands_that_it_shows_run(capsys: pytest.CaptureFixture[str], tmp_path: Any) -> None:  # noqa: ANN401
    from wattproof.__main__ import main  # noqa: PLC0415 - only this test runs the program

    commands = re.findall(r"^\$ wattproof (.+)$", TEXT, flags=re.MULTILINE)
    assert len(commands) == 2
    for command in commands:
        arguments = command.replace("circuit.svg", str(tmp_path / "circuit.svg")).split()
        assert main(arguments) == 0
        assert capsys.readouterr().err == ""
