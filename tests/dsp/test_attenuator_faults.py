"""What a failed part does is what the node equations say, on the input as it is built."""

import math

import attrs
import pytest

from tests.dsp.attenuators import bridge_24_v, into_8_ohm
from tests.dsp.nodal import GROUND, voltages
from wattproof.dsp.attenuator_faults import Fault, faults
from wattproof.dsp.attenuator_leg import Kind


def pin_v(fault: Fault, parts: dict[str, float], input_ohm: float, terminal_v: float) -> float:
    ohm = parts | {fault.part: math.inf if fault.kind is Kind.OPEN else 1e-6}
    circuit = [
        ("out", "middle", ohm["R1a"]),
        ("middle", "pin", ohm["R1b"]),
        ("pin", GROUND, ohm["R2a"]),
        ("pin", GROUND, ohm["R2b"]),
        ("pin", GROUND, input_ohm),
        ("middle", GROUND, 1e15),  # keeps a node that a fault cuts off from floating
    ]
    return voltages(circuit, {"out": terminal_v})["pin"]


def test_the_pin_s_voltage_in_a_single_ended_attenuator() -> None:
    plan = into_8_ohm()
    parts = {"R1a": 4640 * 0.99, "R1b": 4640 * 0.99, "R2a": 1270 * 1.01, "R2b": 1270 * 1.01}
    for fault in faults(plan):
        expected = pin_v(fault, parts, 12e3, 45.0)
        assert fault.pin_v == pytest.approx(expected, rel=1e-6, abs=1e-6)


def test_a_bridge_s_pin_never_gets_more_than_is_said_whatever_the_input_is_like() -> None:
    """One terminal at the rail and the other at ground, the input's 20 kΩ between the pins or from each to ground."""
    plan = bridge_24_v()
    for fault in faults(plan):
        ohm = {"R1a": 2430.0, "R1b": 2430.0, "R2a": 1270.0, "R2b": 1270.0}
        failed = ohm | {fault.part: math.inf if fault.kind is Kind.OPEN else 1e-6}
        both = []
        for leg, part in (("+", failed), ("-", ohm)):
            both += [(f"out{leg}", f"mid{leg}", part["R1a"]), (f"mid{leg}", f"pin{leg}", part["R1b"])]
            both += [(f"pin{leg}", GROUND, part["R2a"]), (f"pin{leg}", GROUND, part["R2b"])]
            both += [(f"mid{leg}", GROUND, 1e15)]
        bound = 1.0001 * max(fault.pin_v, 24.0 / plan.shared_leg.ratio)  # or the sound leg's, the other at the rail
        for wiring in ([("pin+", "pin-", 20e3)], [("pin+", GROUND, 10e3), ("pin-", GROUND, 10e3)]):
            for plus, minus in ((24.0, 0.0), (24.0, 24.0), (24.0, 12.0)):
                solved = voltages(both + wiring, {"out+": plus, "out-": minus})
                assert solved["pin+"] <= bound
                assert abs(solved["pin+"] - solved["pin-"]) <= bound


def test_every_part_is_listed_open_and_shorted_and_parts_bear_it() -> None:
    told = faults(into_8_ohm())
    assert {(fault.part, fault.kind) for fault in told} == {
        (part, kind) for part in ("R1a", "R1b", "R2a", "R2b") for kind in Kind
    }
    assert max(fault.heat_share for fault in told) <= 1.0


@pytest.mark.parametrize(
    "change",
    [{"limit_v": 1.0}, {"limit_ma": 1.0}, {"heat_share": 1.01}, {"voltage_share": 1.01}],
)
def test_a_fault_beyond_any_one_limit_is_not_harmless(change: dict[str, float]) -> None:
    fault = next(fault for fault in faults(into_8_ohm()) if fault.kind is Kind.SHORT)
    assert fault.harmless
    assert not attrs.evolve(fault, **change).harmless  # type: ignore[arg-type] # floats by name
