"""Rejection is what unequal legs leave of a shared voltage."""

import attrs
import numpy as np
import pytest

from tests.dsp.attenuators import bridge_24_v
from wattproof.dsp.attenuator_bridge import common_mode, rejection, standard_rejection, worst_rejection
from wattproof.dsp.attenuator_leg import Leg

LEG = Leg((2430.0, 2430.0), (1270.0, 1270.0), np.inf)


def differences(tolerance: float, count: int) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Return the relative difference of two legs' gains, their parts drawn at random within tolerance."""
    draw = np.random.default_rng(20_071)
    gains = []
    for _ in range(2):
        r1 = (2430.0 * (1 + tolerance * draw.uniform(-1, 1, (2, count)))).sum(axis=0)
        r2 = 1 / (1 / (1270.0 * (1 + tolerance * draw.uniform(-1, 1, (2, count))))).sum(axis=0)
        gains.append(r2 / (r1 + r2))
    return np.asarray((gains[0] - gains[1]) / ((gains[0] + gains[1]) / 2))


def test_standard_rejection_is_the_spread_of_random_parts() -> None:
    spread = differences(0.01, 40_000).std()
    assert standard_rejection(LEG, 0.01) * spread == pytest.approx(1.0, rel=0.02, abs=0)  # 1/√(2·40000) = 0.35 %


def test_no_random_pair_is_worse_than_the_worst_case() -> None:
    assert 1.0 / np.abs(differences(0.01, 40_000)).max() > worst_rejection(LEG, 0.01)


def test_ten_times_better_parts_reject_ten_times_more() -> None:
    plan = bridge_24_v()
    assert rejection(plan, 0.001).standard == pytest.approx(10.0 * rejection(plan, 0.01).standard, rel=1e-12, abs=0)
    assert rejection(plan, 0.001).worst == pytest.approx(10.0 * rejection(plan, 0.01).worst, rel=1e-3, abs=0)


def test_hum_follows_what_both_terminals_share() -> None:
    plan = bridge_24_v()
    twice = attrs.evolve(plan, wish=attrs.evolve(plan.wish, common_mode_vrms=0.2))
    assert rejection(twice).hum_worst == pytest.approx(2.0 * rejection(plan).hum_worst, rel=1e-12, abs=0)
    none = attrs.evolve(plan, wish=attrs.evolve(plan.wish, common_mode_vrms=0.0))
    assert rejection(none).hum_worst_vrms == 0.0


def test_a_pin_stands_what_a_stuck_half_puts_on_it() -> None:
    told = common_mode(bridge_24_v())
    assert told.stuck_v < told.limit_v
    assert told.running_v + told.swing_v < told.stuck_v
