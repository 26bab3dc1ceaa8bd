"""One leg of an attenuator obeys Ohm's law, also with a part missing."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.dsp.nodal import GROUND, voltages
from wattproof.dsp.attenuator_leg import Kind, Leg, parallel, single_faults

OHMS = st.floats(10.0, 1e5)
SAME = 1e-9  # a linear solver's rounding


@given(OHMS, OHMS, OHMS, OHMS, OHMS)
def test_a_leg_is_what_the_node_equations_say(r1a: float, r1b: float, r2a: float, r2b: float, pin: float) -> None:
    leg = Leg((r1a, r1b), (r2a, r2b), pin)
    solved = voltages(
        [
            ("out", "middle", r1a),
            ("middle", "pin", r1b),
            ("pin", GROUND, r2a),
            ("pin", GROUND, r2b),
            ("pin", GROUND, pin),
        ],
        {"out": 10.0},
    )
    across = dict(leg.voltages(10.0))
    assert 10.0 * leg.gain == pytest.approx(solved["pin"], rel=SAME, abs=1e-12)
    assert across["R1a"] == pytest.approx(10.0 - solved["middle"], rel=SAME, abs=1e-9)
    assert across["R1b"] == pytest.approx(solved["middle"] - solved["pin"], rel=SAME, abs=1e-9)
    assert across["R2a"] == across["R2b"] == pytest.approx(solved["pin"], rel=SAME, abs=1e-12)
    # all power that goes in comes out as heat, the input's share included
    heat = sum(watts for _, watts in leg.heat(10.0)) + solved["pin"] ** 2 / pin
    assert heat == pytest.approx(10.0 * (10.0 - solved["middle"]) / r1a, rel=1e-6, abs=0)


def test_source_impedance_leaves_the_input_out_and_the_node_counts_it() -> None:
    leg = Leg((1000.0, 1000.0), (2000.0, 2000.0), 1000.0)
    assert leg.source_ohm == pytest.approx(2000.0 / 3.0, rel=1e-12, abs=0)
    assert leg.node_ohm == pytest.approx(400.0, rel=1e-12, abs=0)


@given(OHMS, OHMS, OHMS, st.floats(1e-4, 0.05), st.floats(0.0, 0.3))
def test_no_corner_of_the_tolerances_lies_beyond_the_extremes(
    r1: float, r2: float, pin: float, tolerance: float, input_tolerance: float
) -> None:
    leg = Leg((r1, r1), (r2, r2), pin)
    most = leg.toleranced(tolerance, input_tolerance, most=True).gain
    least = leg.toleranced(tolerance, input_tolerance, most=False).gain
    signs = [[1.0 if corner >> bit & 1 else -1.0 for bit in range(5)] for corner in range(32)]
    gains = [
        Leg(
            (r1 * (1 + a * tolerance), r1 * (1 + b * tolerance)),
            (r2 * (1 + c * tolerance), r2 * (1 + d * tolerance)),
            pin * (1 + e * input_tolerance),
        ).gain
        for a, b, c, d, e in signs
    ]
    assert max(gains) == pytest.approx(most, rel=1e-12, abs=0)
    assert min(gains) == pytest.approx(least, rel=1e-12, abs=0)


@given(OHMS, OHMS, OHMS)
def test_sensitivities_are_what_a_small_change_does(r1: float, r2: float, pin: float) -> None:
    step = 1e-5
    leg = Leg((r1, 2 * r1), (r2, 3 * r2), pin)
    moved = {
        "R1a": Leg((r1 * (1 + step), 2 * r1), (r2, 3 * r2), pin),
        "R1b": Leg((r1, 2 * r1 * (1 + step)), (r2, 3 * r2), pin),
        "R2a": Leg((r1, 2 * r1), (r2 * (1 + step), 3 * r2), pin),
        "R2b": Leg((r1, 2 * r1), (r2, 3 * r2 * (1 + step)), pin),
        "input impedance": Leg((r1, 2 * r1), (r2, 3 * r2), pin * (1 + step)),
    }
    for name, sensitivity in leg.sensitivities():
        change = math.log(moved[name].gain / leg.gain) / step
        assert sensitivity == pytest.approx(change, rel=1e-4, abs=1e-9)  # of second order in the step


def test_every_part_fails_both_ways() -> None:
    found = {(name, kind) for name, kind, _ in single_faults(Leg((1.0, 2.0), (3.0, 4.0), 5.0))}
    assert found == {(name, kind) for name in ("R1a", "R1b", "R2a", "R2b") for kind in Kind}


@pytest.mark.parametrize(
    ("name", "kind", "gain"),
    # R1 = 2 + 2 kΩ, R2 = 2 kΩ ∥ 2 kΩ, no input: by hand
    [
        ("R1a", Kind.OPEN, 0.0),
        ("R1a", Kind.SHORT, 1.0 / 3.0),
        ("R2b", Kind.OPEN, 1.0 / 3.0),
        ("R2b", Kind.SHORT, 0.0),
    ],
)
def test_what_a_fault_leaves(name: str, kind: Kind, gain: float) -> None:
    leg = Leg((2e3, 2e3), (2e3, 2e3), math.inf)
    left = {(part, how): found for part, how, found in single_faults(leg)}[name, kind]
    assert left.gain == pytest.approx(gain, rel=1e-12, abs=0)
    assert all(math.isfinite(watts) for _, watts in left.heat(10.0))
    assert dict(left.voltages(10.0))[name] == 0.0


@given(OHMS, OHMS, OHMS)
def test_one_fault_of_equal_halves_never_more_than_doubles_what_comes_through(r1: float, r2: float, pin: float) -> None:
    leg = Leg((r1, r1), (r2, r2), pin)
    assert all(left.gain <= 2.0 * leg.gain for _, _, left in single_faults(leg))


def test_parallel_of_nothing_is_open_and_with_a_short_is_short() -> None:
    assert parallel(()) == math.inf
    assert parallel((100.0, math.inf)) == 100.0
    assert parallel((100.0, 0.0)) == 0.0


def test_a_leg_without_anything_below_passes_all() -> None:
    assert Leg((1e3,), (), math.inf).gain == 1.0
    assert Leg((1e3,), (0.0,), 1e4).ratio == math.inf
