"""Intervals carry a known shape through, budgets add up, and stated limits become standard uncertainties."""

import math

import mpmath
import pytest

from wattproof.core.quantity import Part, Quantity, measured
from wattproof.core.rounding import expanded
from wattproof.dsp.intervals import Shape, arcsine, budget, interval95, rectangular, resolution, triangular

GRID = 1e-5  # of the half-width: what 4000 bins leave at the edge of an arcsine, ten times less elsewhere


def of_shape(shape: Shape, half_width: float, *others: Part) -> tuple[Quantity, dict[str, Shape]]:
    u = {Shape.RECTANGULAR: rectangular, Shape.TRIANGULAR: triangular, Shape.ARCSINE: arcsine}[shape](half_width)
    return Quantity(1.0, "V", (Part("shaped", u), *others)), {"shaped": shape}


def test_limits_become_standard_uncertainties() -> None:
    # JCGM 100:2008, 4.3.7, 4.3.9, F.2.2.1; JCGM 101:2008, 6.4.6, to the digits of a pocket calculator
    assert rectangular(1.0) == pytest.approx(0.577350, rel=0, abs=5e-7)
    assert triangular(1.0) == pytest.approx(0.408248, rel=0, abs=5e-7)
    assert arcsine(1.0) == pytest.approx(0.707107, rel=0, abs=5e-7)
    assert resolution(1.0) == pytest.approx(0.288675, rel=0, abs=5e-7)


def test_without_shapes_it_is_students_factor() -> None:
    quantity = measured(10.0, 0.1, "V", 9.7)
    got = interval95(quantity)
    assert got.half_width == expanded(quantity)
    assert (got.low, got.high) == (10.0 - got.half_width, 10.0 + got.half_width)
    assert not got.from_shapes


@pytest.mark.parametrize(
    ("shape", "half_width"),
    # closed forms of P(|x| ≤ h) = 0.95 for half-width 1
    [
        (Shape.RECTANGULAR, 0.95),
        (Shape.TRIANGULAR, 1.0 - math.sqrt(0.05)),
        (Shape.ARCSINE, math.sin(0.95 * math.pi / 2.0)),
    ],
)
def test_one_shape_alone_gives_its_own_quantile(shape: Shape, half_width: float) -> None:
    quantity, shapes = of_shape(shape, 2.0)
    got = interval95(quantity, shapes)
    assert got.from_shapes
    assert got.half_width == pytest.approx(2.0 * half_width, rel=0, abs=2.0 * GRID)


def test_two_equal_rectangles_make_a_triangle() -> None:
    quantity = Quantity(0.0, "V", (Part("a", rectangular(1.0)), Part("b", -rectangular(1.0))))
    got = interval95(quantity, {"a": Shape.RECTANGULAR, "b": Shape.RECTANGULAR})
    assert got.half_width == pytest.approx(2.0 * (1.0 - math.sqrt(0.05)), rel=0, abs=GRID)


@pytest.mark.parametrize("sigma", [0.02, 0.3, 1.0, 5.0])
def test_a_rectangle_beside_a_normal_part_is_the_convolution_of_both(sigma: float) -> None:
    quantity, shapes = of_shape(Shape.RECTANGULAR, 1.0, Part("noise", sigma))
    x = interval95(quantity, shapes).half_width

    def within(offset: mpmath.mpf) -> mpmath.mpf:
        return (mpmath.ncdf((x - offset) / sigma) - mpmath.ncdf((-x - offset) / sigma)) / 2

    # numerical integration by mpmath, a general library
    assert float(mpmath.quad(within, mpmath.linspace(-1, 1, 21))) == pytest.approx(0.95, rel=0, abs=1e-6)


def test_few_degrees_of_freedom_of_the_rest_widen_the_interval() -> None:
    narrow, shapes = of_shape(Shape.RECTANGULAR, 1.0, Part("noise", 0.5))
    wide, _ = of_shape(Shape.RECTANGULAR, 1.0, Part("noise", 0.5, 3))
    assert interval95(wide, shapes).half_width > 1.1 * interval95(narrow, shapes).half_width
    unknown, _ = of_shape(Shape.RECTANGULAR, 1.0, Part("noise", 0.5, 0.9))
    assert math.isinf(interval95(unknown, shapes).half_width)


def test_a_small_shape_leaves_the_normal_interval() -> None:
    quantity, shapes = of_shape(Shape.ARCSINE, 1e-3, Part("noise", 1.0))
    assert interval95(quantity, shapes).half_width == pytest.approx(1.959964, rel=0, abs=1e-5)


def test_a_shape_of_a_source_that_is_absent_or_nothing_changes_nothing() -> None:
    quantity = Quantity(1.0, "V", (Part("noise", 0.1), Part("resistor", 0.0)))
    assert interval95(quantity, {"resistor": Shape.RECTANGULAR, "lead": Shape.ARCSINE}) == interval95(quantity)


def test_the_result_is_the_same_every_time() -> None:
    quantity, shapes = of_shape(Shape.TRIANGULAR, 0.3, Part("noise", 0.1, 7))
    assert interval95(quantity, shapes) == interval95(quantity, shapes)


def test_a_budget_names_the_largest_first_and_its_shares_add_up() -> None:
    quantity = Quantity(50.0, "W", (Part("load", -0.3, 9), Part("level calibration", 0.4), Part("rows#1", 0.0)))
    rows = budget(quantity)
    assert [(row.source, row.u, row.dof) for row in rows[:2]] == [
        ("level calibration", 0.4, math.inf),
        ("load", 0.3, 9),
    ]
    assert [row.share for row in rows] == [
        pytest.approx(0.64, rel=1e-12, abs=0),
        pytest.approx(0.36, rel=1e-12, abs=0),
        0.0,
    ]


def test_a_budget_shows_joint_observations_as_one_source() -> None:
    quantity = Quantity(1.0, "V", (Part("rows#1", 3.0, 4), Part("rows#2", -4.0, 4)))
    (row,) = budget(quantity)
    assert (row.source, row.u, row.share, row.dof) == ("rows", 5.0, 1.0, 4)


def test_a_budget_of_something_exact_is_empty() -> None:
    assert budget(Quantity(1.0, "V")) == ()
