"""Efficiency and heat: the simulated supply's meters against what its loads take."""

import pytest

from tests.procedures.sitting import done, result
from wattproof.bench.simulated.extras import SUPPLY_EFFICIENCY, SUPPLY_IDLE_W
from wattproof.core.notes import Kind
from wattproof.procedures.efficiency import EfficiencyPlan


def test_the_balance_is_that_of_the_simulated_supply() -> None:
    for point in done("efficiency").points:
        output_w = point.output_w.value
        supply_w = SUPPLY_IDLE_W + output_w / SUPPLY_EFFICIENCY
        # the meters average over half a second and more, not over whole cycles
        assert point.supply_w.value == pytest.approx(supply_w, rel=2e-3, abs=0.0)
        assert point.balance.efficiency.value == pytest.approx(output_w / supply_w, rel=2e-3, abs=0.0)
        assert point.balance.heat_w.value == pytest.approx(supply_w - output_w, rel=5e-3, abs=0.0)


def test_output_is_the_sum_of_both_channels() -> None:
    top = done("efficiency").points[-1]
    expected_w = 4.0**2 / 8.0 * (1.0 + 0.983**2)  # the channels are made 0.983 alike
    assert top.output_w.value == pytest.approx(expected_w, rel=0.01, abs=0.0)


def test_more_output_than_supply_is_called_impossible() -> None:
    told = result(EfficiencyPlan(levels_vrms="4", supply="12:0.1", read_s=0.2))
    assert Kind.SUPPLY_IMPOSSIBLE in {note.kind for note in told.notes}


@pytest.mark.parametrize(
    ("levels", "supply", "why"),
    [("2,1", "", "rising order"), ("1,2", "12:0.5", "one V:A for each"), ("1", "12 V", "volts and amperes")],
)
def test_what_does_not_fit_together_is_refused(levels: str, supply: str, why: str) -> None:
    with pytest.raises(ValueError, match=why):
        EfficiencyPlan(levels_vrms=levels, supply=supply)
