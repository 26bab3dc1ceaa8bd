"""Runs at a converter's rails."""

import numpy as np
import pytest

from wattproof.bench.rails import integer_rails, rail_runs
from wattproof.core.signal import Overload


def test_rails_of_sixteen_bits_are_its_extreme_codes() -> None:
    assert integer_rails(16) == (-1.0, 32767 / 32768)


def test_a_run_is_told_by_channel_place_and_length() -> None:
    samples = np.zeros((10, 2))
    samples[3:6, 0] = 1.0
    samples[8:, 1] = -1.0
    samples[0, 1] = 1.0
    assert rail_runs(samples, -1.0, 1.0, first_frame=100) == (Overload(1, 103, 3), Overload(2, 108, 2))


def test_a_single_sample_counts_where_it_is_asked_for() -> None:
    samples = np.zeros((5, 1))
    samples[4] = 1.0
    assert rail_runs(samples, -1.0, 1.0) == ()
    assert rail_runs(samples, -1.0, 1.0, at_least=1) == (Overload(1, 4, 1),)


@pytest.mark.parametrize("frames", [0, 1])
def test_next_to_nothing_has_no_runs(frames: int) -> None:
    assert rail_runs(np.zeros((frames, 2)), -1.0, 1.0, at_least=1) == ()


def test_no_more_runs_than_asked_for_are_told() -> None:
    samples = np.tile(np.array([[1.0], [1.0], [0.0]]), (50, 1))
    assert len(rail_runs(samples, -1.0, 1.0)) == 50
    assert len(rail_runs(samples, -1.0, 1.0, most=7)) == 7
