"""The interface's own share of a reading: |out| + |in| with 2u, the level law, and what lies beyond the levels."""

import math

import pytest

from wattproof.core.calibration import Calibration, Floor
from wattproof.core.quantity import measured
from wattproof.core.rig import Wiring
from wattproof.dsp.interface_floor import Levels, bound_at, own_lines, own_noise


def floor(level_fs: float, ratio: float, u: float = 0.0, order: int = 3, noise_fs: float = 1e-6) -> Floor:
    return Floor(1, level_fs, measured(noise_fs, 0.0, "1"), ((order, measured(ratio, u, "1")),))


LAWFUL = (floor(0.125, 1e-6), floor(0.25, 4e-6), floor(0.5, 16e-6))


def test_a_bound_carries_two_u() -> None:
    assert bound_at([floor(0.5, 1e-5, 1e-6)], 3, 0.5).ratio == pytest.approx(1.2e-5, rel=1e-12, abs=0.0)


def test_within_the_levels_it_follows_the_law_of_its_order() -> None:
    bound = bound_at(LAWFUL, 3, 0.25 / math.sqrt(2.0))
    assert bound.ratio == pytest.approx(2e-6, rel=1e-9, abs=0.0)  # half the level's square of 4e-6
    assert not bound.extrapolated


def test_a_noisy_lower_level_does_not_widen_a_bound_that_the_law_carries() -> None:
    noisy = (floor(0.125, 3e-6, 2e-6), floor(0.5, 16e-6, 1e-7))
    assert bound_at(noisy, 3, 0.125).ratio == pytest.approx(16.2e-6 / 16.0, rel=1e-9, abs=0.0)


def test_a_converter_that_breaks_the_law_is_bound_by_what_was_seen() -> None:
    breaking = (floor(0.125, 9e-6, 1e-7), floor(0.5, 16e-6, 1e-7))
    assert bound_at(breaking, 3, 0.2).ratio == pytest.approx(16.2e-6, rel=1e-9, abs=0.0)
    assert bound_at(breaking, 3, 0.125).ratio == pytest.approx(9.2e-6, rel=1e-9, abs=0.0)


def test_above_the_highest_level_it_is_the_law_times_two_and_marked() -> None:
    bound = bound_at(LAWFUL, 3, 1.0)
    assert bound.ratio == pytest.approx(2.0 * 16e-6 * 4.0, rel=1e-9, abs=0.0)
    assert bound.extrapolated
    assert bound_at(LAWFUL, 3, 0.01).extrapolated


def test_out_and_in_add_whatever_their_phases() -> None:
    calibration = Calibration(out_floors=(floor(0.5, 2e-6),), in_floors=(floor(0.5, 3e-6),))
    lines = own_lines(calibration, Wiring(), Levels(0.5, 0.5))
    assert lines[3].ratio == pytest.approx(5e-6, rel=1e-9, abs=0.0)
    assert own_lines(Calibration(), Wiring(), Levels(0.5)) == {}


def test_a_drive_that_is_not_known_counts_as_the_worst() -> None:
    calibration = Calibration(out_floors=LAWFUL, in_floors=(floor(0.5, 0.0),))
    assert own_lines(calibration, Wiring(), Levels(0.5))[3].out.ratio == pytest.approx(16e-6, rel=1e-9, abs=0.0)


def test_the_noise_of_the_converter_out_keeps_its_ratio_to_the_tone() -> None:
    calibration = Calibration(out_floors=(floor(0.1, 0.0, noise_fs=3e-6),), in_floors=(floor(0.1, 0.0, noise_fs=4e-6),))
    own = own_noise(calibration, Wiring(), Levels(input_fs=0.4, drive_fs=0.1))
    assert own is not None
    assert own.value == pytest.approx(math.hypot(4e-6, 12e-6), rel=1e-12, abs=0.0)
    assert own_noise(Calibration(), Wiring(), Levels(0.4)) is None
