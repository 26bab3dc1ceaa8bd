"""A run of 500 tables: stated intervals hold the truth as often as they say, limits more often, floors never pass."""

import pytest
from scipy.stats import binom

from tests.benchmarks.coverage import Coverage, lines, run

TABLES = 500
CHANCE = 1e-3  # that a row of a true 95 % falls below what is asked of so few
FEWEST = 60  # intervals in a row that is judged


@pytest.fixture(scope="module")
def coverage() -> Coverage:
    return run(TABLES)


def test_every_table_could_be_read(coverage: Coverage) -> None:
    assert (coverage.tables, coverage.failed) == (TABLES, 0)


def test_intervals_hold_the_truth_as_often_as_they_say(coverage: Coverage) -> None:
    # JCGM 100:2008, 6.2; the goal of 94-96 % is that of 10 000 tables, so what a true 95 % gives in fewer is allowed
    judged = {name: tally for name, tally in coverage.intervals.items() if tally.seen >= FEWEST}
    assert {"level", "power", "noise"} <= judged.keys()
    for name, tally in judged.items():
        least, most = binom.ppf(CHANCE, tally.seen, 0.94), binom.ppf(1.0 - CHANCE, tally.seen, 0.96)
        assert least <= tally.held <= most, (name, tally.held, tally.seen)


def test_limits_and_worst_cases_hold_it_more_often(coverage: Coverage) -> None:
    for group in (coverage.bounds, coverage.limits, coverage.floors):
        for name, tally in group.items():
            assert tally.held >= binom.ppf(CHANCE, tally.seen, 0.95), (name, tally.held, tally.seen)


def test_an_interface_floor_is_never_an_amplifiers_reading(coverage: Coverage) -> None:
    assert coverage.floors_as_readings == 0
    assert coverage.unseen_as_readings == 0


def test_the_table_names_every_row_and_its_goal(coverage: Coverage) -> None:
    told = list(lines(coverage))
    assert told[0].startswith("500 tables")
    assert all("94-96" in row for row in told if "interval" in row)
