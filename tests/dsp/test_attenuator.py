"""The planner's promises hold for whatever is asked of it."""

import math
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.dsp.attenuators import bridge_24_v, into_8_ohm
from tests.dsp.nodal import GROUND, voltages
from wattproof.dsp.attenuator import Plan, plan
from wattproof.dsp.attenuator_faults import faults
from wattproof.dsp.attenuator_wish import Wish
from wattproof.dsp.eseries import Series, values
from wattproof.dsp.intervals import budget

ROUNDING = 1.0 + 1e-9


def wishes() -> st.SearchStrategy[Wish]:
    """Return what people may ask for: from headphones to a public-address amplifier, on any line input."""

    def build(power_w: float, load_ohm: float, **more: Any) -> Wish:  # noqa: ANN401 - the fields of a value
        headroom = more.pop("over_rail")
        rail = None if headroom is None else math.sqrt(2.0 * power_w * load_ohm) * headroom
        return Wish(power_w=power_w, load_ohm=load_ohm, rail_v=rail, **more)

    both = st.sampled_from([(False, False), (True, False), (True, True)])
    return both.flatmap(
        lambda legs: st.builds(
            build,
            power_w=st.floats(0.01, 1000.0),
            load_ohm=st.floats(2.0, 32.0),
            full_scale_vrms=st.floats(0.1, 20.0),
            input_ohm=st.floats(1e3, 1e6),
            bridge_tied=st.just(legs[0]),
            two_inputs=st.just(legs[1]),
            series=st.sampled_from(Series),
            tolerance=st.sampled_from([None, 0.001, 0.01, 0.05]),
            over_rail=st.sampled_from([None, 1.2, 2.0]),
        )
    )


@settings(max_examples=60)
@given(wishes())
def test_no_single_fault_harms_input_or_parts(wish: Wish) -> None:
    planned = plan(wish)
    assert all(fault.harmless for fault in faults(planned))


@settings(max_examples=60)
@given(wishes())
def test_the_level_leaves_twice_the_room_even_at_worst(wish: Wish) -> None:
    least, greatest = plan(wish).extremes()
    assert wish.seen_vrms / least * 2.0 <= wish.full_scale_vrms * ROUNDING
    assert least <= plan(wish).leg.ratio <= greatest


@settings(max_examples=60)
@given(wishes())
def test_parts_are_of_the_series_and_stay_below_half_their_rating(wish: Wish) -> None:
    planned = plan(wish)
    for part in planned.parts:
        assert part.ohm in values(wish.series)
        assert part.running_w <= part.rated_w / 2.0
        assert part.running_v**2 / part.ohm <= part.rated_w / 2.0  # with the rail on for good
        assert part.fault_w <= part.rated_w
        assert part.running_v <= part.rated_v
        assert part.fault_v <= part.rated_v
    assert planned.with_attenuator_ohm > 0.98 * wish.load_ohm


@settings(max_examples=30)
@given(wishes())
def test_the_ratio_is_what_the_node_equations_say(wish: Wish) -> None:
    planned = plan(wish)
    seen = _input_voltage(planned, wish.full_vrms)
    assert wish.full_vrms / planned.leg.ratio == pytest.approx(
        seen * (2.0 if wish.two_inputs else 1.0), rel=1e-9, abs=0
    )


def _input_voltage(planned: Plan, volts: float) -> float:
    """Return what one input sees, the terminals of a bridge moving against each other; the input as it is built."""
    (r1a, r1b), (r2a, r2b), wish = planned.leg.upper_ohm, planned.leg.lower_ohm, planned.wish
    circuit = []
    for sign in "+-":
        circuit += [(f"out{sign}", f"mid{sign}", r1a), (f"mid{sign}", f"pin{sign}", r1b)]
        circuit += [(f"pin{sign}", GROUND, r2a), (f"pin{sign}", GROUND, r2b)]
    if wish.is_balanced:
        circuit.append(("pin+", "pin-", wish.input_ohm))
    else:
        circuit += [(f"pin{sign}", GROUND, wish.input_ohm) for sign in "+-"]
    low, high = (-volts / 2.0, volts / 2.0) if wish.bridge_tied else (0.0, volts)
    solved = voltages(circuit, {"out+": high, "out-": low})
    return solved["pin+"] - solved["pin-"] if wish.is_balanced else solved["pin+"]


def test_a_bridge_s_budget_names_both_legs_and_the_input_once() -> None:
    sources = [part.source for part in bridge_24_v().ratio().parts]
    assert sorted(sources) == sorted(
        [f"attenuator {part}{leg}" for part in ("R1a", "R1b", "R2a", "R2b") for leg in "+-"] + ["input impedance"]
    )
    assert sum(row.share for row in budget(into_8_ohm().ratio())) == pytest.approx(1.0, rel=1e-12, abs=0)


def test_a_known_input_impedance_leaves_the_parts_as_the_largest_source() -> None:
    known = plan(Wish(power_w=100, load_ohm=8, full_scale_vrms=4, input_ohm=10e3, rail_v=45, input_tolerance=0.01))
    assert budget(known.ratio())[0].source.startswith("attenuator R1")


def test_an_input_that_stands_less_gets_less() -> None:
    careful = plan(Wish(power_w=100, load_ohm=8, full_scale_vrms=4, input_ohm=10e3, rail_v=45, input_limit_v=2))
    assert careful.leg.ratio > 2.0 * into_8_ohm().leg.ratio
    weak = plan(Wish(power_w=100, load_ohm=8, full_scale_vrms=4, input_ohm=10e3, rail_v=45, input_limit_ma=1))
    assert min(weak.leg.upper_ohm) > 45.0 / 1e-3


def test_an_input_that_would_stand_it_all_still_gets_a_divider() -> None:
    small = plan(Wish(power_w=0.01, load_ohm=8, full_scale_vrms=10, input_ohm=1e6))
    assert small.extremes()[0] >= 2.0


@pytest.mark.parametrize(
    ("given_", "said"),
    [
        ({"rail_v": 20.0}, "rail is 20 V, but 100 W into 8 Ω swings to 40 V; give at least that, or less power"),
        ({"power_w": 0.0}, "power is 0 W; it must lie from 0.001 to 100000 W"),
        ({"input_ohm": math.nan}, "input impedance is nan Ω"),
        ({"two_inputs": True}, "two inputs are for a bridge-tied output"),
        ({"power_w": 1e5}, "use a high-voltage probe made for it, or give less power"),
        ({"full_scale_vrms": 0.01, "power_w": 3, "load_ohm": 0.5, "input_limit_ma": 1e3}, "use an input of higher"),
    ],
)
def test_what_cannot_be_is_refused_with_a_way_out(given_: dict[str, Any], said: str) -> None:
    usual: dict[str, Any] = {"power_w": 100.0, "load_ohm": 8.0, "full_scale_vrms": 4.0, "input_ohm": 10e3}
    with pytest.raises(ValueError, match=said):
        plan(Wish(**(usual | given_)))
