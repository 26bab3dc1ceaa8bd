"""Axes: places of values, and the lines of a grid."""

import numpy as np
import pytest

from wattproof.gui.axes import Axis, between, decades, tidy, widened


def test_a_log_axis_places_equal_ratios_equally_far_apart() -> None:
    axis = Axis(0.01, 100.0, log=True)
    np.testing.assert_allclose(axis.place(np.array([0.01, 0.1, 1.0, 100.0])), [0.0, 0.25, 0.5, 1.0], rtol=0, atol=1e-12)
    assert axis.spot(10.0) == pytest.approx(0.75, rel=0, abs=1e-12)


def test_what_has_no_logarithm_stands_below_the_axis_and_is_finite() -> None:
    axis = Axis(1.0, 10.0, log=True)
    assert np.all(np.isfinite(axis.place(np.array([0.0, -1.0]))))
    assert axis.spot(0.0) < 0


def test_decades_and_what_is_between() -> None:
    axis = Axis(0.1, 10.0, log=True)
    np.testing.assert_allclose(decades(axis), [0.1, 1.0, 10.0], rtol=1e-12, atol=0)
    np.testing.assert_allclose(between(axis), [0.2, 0.5, 2.0, 5.0], rtol=1e-12, atol=0)


def test_an_axis_grows_by_whole_decades() -> None:
    grown = widened(Axis(0.1, 10.0, log=True), 350.0)
    np.testing.assert_allclose([grown.low, grown.high], [0.1, 1000.0], rtol=1e-12, atol=0)
    assert widened(grown, 5.0) == grown
    assert widened(grown, float("nan")) == grown


@pytest.mark.parametrize(("value", "expected"), [(0.9, 1.0), (1.1, 2.0), (3.0, 5.0), (51.0, 100.0), (0.0, 1.0)])
def test_tidy_scales(value: float, expected: float) -> None:
    assert tidy(value) == pytest.approx(expected, rel=1e-12, abs=0)
