"""Dividers, tolerances and heat against hand-computed values: Ohm's law, recheckable on a pocket calculator."""

import math

import pytest

from wattproof.core.units import db
from wattproof.dsp.attenuator_bridge import standard_rejection, worst_rejection
from wattproof.dsp.attenuator_leg import Leg
from wattproof.dsp.intervals import rectangular


def printed(value: float) -> object:
    """Return a value to be met within half of the last of its four decimals."""
    return pytest.approx(value, rel=0, abs=5.1e-5)


@pytest.mark.parametrize(
    ("r1", "r2", "ratio", "level_db"),
    [(10e3, 1e3, 11, -20.8279), (22e3, 1e3, 23, -27.2346), (47e3, 1e3, 48, -33.6248), (100e3, 1e3, 101, -40.0864)],
)
def test_an_unloaded_divider(r1: float, r2: float, ratio: float, level_db: float) -> None:
    leg = Leg((r1,), (r2,), math.inf)
    assert leg.ratio == pytest.approx(ratio, rel=1e-12, abs=0)
    assert db(leg.gain) == printed(level_db)


@pytest.mark.parametrize(
    ("r1", "input_ohm", "ratio", "change_db", "power_percent"),
    # ratio = 1 + R1/(R2 ∥ R_in), R2 = 1 kΩ; the change against no load, and the power lost if it is ignored
    [
        (10e3, 10e3, 12.0, -0.7558, -15.97),
        (10e3, 47e3, 11.2128, -0.1664, -3.76),
        (10e3, 1e6, 11.01, -0.0079, -0.18),
        (22e3, 10e3, 25.2, -0.7935, None),
        (22e3, 47e3, 23.4681, -0.1750, None),
        (22e3, 1e6, 23.022, -0.0083, None),
        (47e3, 10e3, 52.7, -0.8114, None),
        (47e3, 47e3, 49.0, -0.1791, None),
        (47e3, 1e6, 48.047, -0.0085, None),
        (100e3, 10e3, 111.0, -0.8200, None),
        (100e3, 47e3, 103.1277, -0.1811, None),
        (100e3, 1e6, 101.1, -0.0086, None),
    ],
)
def test_a_divider_loaded_by_an_input(
    r1: float, input_ohm: float, ratio: float, change_db: float, power_percent: float | None
) -> None:
    unloaded, loaded = Leg((r1,), (1e3,), math.inf), Leg((r1,), (1e3,), input_ohm)
    change = loaded.gain / unloaded.gain
    assert loaded.ratio == printed(ratio)
    assert db(change) == printed(change_db)
    if power_percent is not None:
        assert 100.0 * (change**2 - 1.0) == pytest.approx(power_percent, rel=0, abs=5.1e-3)


def test_tolerances_of_one_per_cent() -> None:
    # 10 kΩ over 1 kΩ, both 1 %: +0.1578 / −0.1581 dB at worst, 0.7423 % standard (rectangular, independent)
    leg = Leg((10e3,), (1e3,), math.inf)
    most, least = leg.toleranced(0.01, 0.0, most=True), leg.toleranced(0.01, 0.0, most=False)
    assert db(most.gain / leg.gain) == printed(0.1578)
    assert db(least.gain / leg.gain) == printed(-0.1581)
    relative = math.hypot(*(sensitivity * rectangular(0.01) for _, sensitivity in leg.sensitivities()))
    assert 100.0 * relative == printed(0.7423)


def test_heat_of_a_divider_across_a_load() -> None:
    # 100 W in 8 Ω are √800 V = 28.284 V: 72.7 mW into 11 kΩ, of which 66.1 mW in the 10 kΩ part
    heat = dict(Leg((10e3,), (1e3,), math.inf).heat(math.sqrt(800.0)))
    assert 1e3 * sum(heat.values()) == pytest.approx(72.7, rel=0, abs=0.05)
    assert 1e3 * heat["R1a"] == pytest.approx(66.1, rel=0, abs=0.05)


def test_rejection_of_one_per_cent_parts() -> None:
    """Two dividers of a single R1 and R2 each, closed form: 1/(4kt) worst, 1/(2kt/√3) standard, k = R1/(R1+R2)."""
    leg = Leg((10e3,), (1e3,), math.inf)
    k = 10.0 / 11.0
    assert db(worst_rejection(leg, 0.01)) == pytest.approx(db(1.0 / (4.0 * k * 0.01)), rel=0, abs=0.01)
    assert db(standard_rejection(leg, 0.01)) == pytest.approx(db(math.sqrt(3.0) / (2.0 * k * 0.01)), rel=0, abs=1e-9)
    assert round(db(worst_rejection(leg, 0.01))) == 29
    assert round(db(standard_rejection(leg, 0.01))) == 40
    # halves with errors of their own average: 3 dB better by standard uncertainty, no better in the worst case
    halves = Leg((5e3, 5e3), (2e3, 2e3), math.inf)
    assert db(standard_rejection(halves, 0.01) / standard_rejection(leg, 0.01)) == printed(3.0103)
    assert worst_rejection(halves, 0.01) == pytest.approx(worst_rejection(leg, 0.01), rel=1e-12, abs=0)
