"""Arithmetic on quantities keeps track of what they share."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wattproof.core.quantity import Part, Quantity, measured
from wattproof.dsp.uncertainty import (
    combined,
    decibels,
    difference,
    exact,
    from_decibels,
    known,
    mean,
    named_scatter,
    observed,
    observed_together,
    power,
    product,
    ratio,
    root,
    settled,
    total,
)

CLOSED_FORM = 1e-12  # the same few operations in another order: rounding only


def level(value: float, calibration: float, scatter: float, name: str) -> Quantity:
    """Return a level whose calibration error is relative and shared, and whose scatter is its own."""
    return Quantity(value, "V", (Part("level calibration", value * calibration), Part(f"scatter of {name}", scatter)))


def test_a_ratio_loses_what_is_common_to_both() -> None:
    # u(a/b)/(a/b) = √((3/3000)² + (4/4000)²): the calibration, 1 % of each, cancels (GUM 5.2.2 with r = 1)
    got = ratio(level(3.0, 0.01, 3e-3, "left"), level(4.0, 0.01, 4e-3, "right"))
    assert got.value == 0.75
    assert got.u == pytest.approx(0.75 * math.sqrt(2e-6), rel=CLOSED_FORM, abs=0)


def test_a_sum_adds_what_is_common_before_it_squares() -> None:
    got = total([level(3.0, 0.01, 0.0, "left"), level(4.0, 0.01, 0.0, "right")])
    assert got.value == 7.0
    assert got.u == pytest.approx(0.07, rel=CLOSED_FORM, abs=0)  # not √(0.03² + 0.04²) = 0.05


def test_a_difference_of_the_same_is_exactly_nothing() -> None:
    voltage = known(20.0, "V", "meter", 0.04)
    assert difference(voltage, voltage) == Quantity(0.0, "V", (Part("meter", 0.0),))


def test_a_product_adds_relative_parts() -> None:
    got = product(known(2.0, "V", "meter", 0.02), known(3.0, "A", "shunt", 0.03), "W")
    assert (got.value, got.unit) == (6.0, "W")
    assert got.u == pytest.approx(6.0 * 0.01 * math.sqrt(2.0), rel=CLOSED_FORM, abs=0)


def test_a_product_with_itself_is_its_square() -> None:
    voltage = known(20.0, "V", "meter", 0.04)
    assert product(voltage, voltage, "V²") == power(voltage, 2.0, "V²")


@given(st.floats(0.01, 1e4), st.floats(1e-6, 0.1), st.sampled_from([-2.0, -1.0, 0.5, 2.0, 3.0]))
def test_a_power_multiplies_the_relative_uncertainty(value: float, relative: float, exponent: float) -> None:
    got = power(known(value, "V", "meter", value * relative), exponent, "?")
    assert got.value == pytest.approx(value**exponent, rel=CLOSED_FORM, abs=0)
    assert got.u == pytest.approx(abs(exponent) * relative * value**exponent, rel=CLOSED_FORM, abs=0)


def test_a_root_undoes_a_square() -> None:
    voltage = known(20.0, "V", "meter", 0.04)
    got = root(power(voltage, 2.0, "V²"), "V")
    assert got.value == 20.0
    assert got.u == pytest.approx(0.04, rel=CLOSED_FORM, abs=0)


def test_decibels_have_the_slope_of_the_logarithm() -> None:
    got = decibels(known(10.0, "1", "meter", 0.1))
    assert got.unit == "dB"
    assert got.value == pytest.approx(20.0, rel=0, abs=1e-12)
    assert got.u == pytest.approx(0.08685889638, rel=1e-9, abs=0)  # 20/ln 10 · 1 %
    back = from_decibels(got)
    assert back.value == pytest.approx(10.0, rel=1e-12, abs=0)
    assert back.u == pytest.approx(0.1, rel=1e-9, abs=0)


def test_signs_are_kept_through_a_chain() -> None:
    # f = (a + b)/(a − b) with a = 5, b = 3: ∂f/∂a = −2b/(a − b)² = −1.5, ∂f/∂b = 2a/(a − b)² = 2.5
    a, b = known(5.0, "V", "a", 0.1), known(3.0, "V", "b", 0.1)
    got = ratio(total([a, b]), difference(a, b))
    parts = {part.source: part.u for part in got.parts}
    assert got.value == 4.0
    assert parts == {"a": pytest.approx(-0.15, rel=CLOSED_FORM), "b": pytest.approx(0.25, rel=CLOSED_FORM)}


def test_what_is_computed_of_a_limit_is_a_limit() -> None:
    limit = Quantity(1e-5, "1", (), "interface")
    assert ratio(limit, exact(2.0, "1")).limited_by == "interface"
    assert ratio(exact(1.0, "V"), exact(2.0, "V")).limited_by is None


def test_two_unnamed_scatters_are_not_taken_for_one() -> None:
    with pytest.raises(ValueError, match="tell their scatter apart with named_scatter first"):
        ratio(measured(3.0, 0.1, "V"), measured(4.0, 0.1, "V"))
    got = ratio(named_scatter(measured(3.0, 0.03, "V"), "8 Ω"), named_scatter(measured(4.0, 0.04, "V"), "4 Ω"))
    assert got.u == pytest.approx(0.75 * 0.01 * math.sqrt(2.0), rel=CLOSED_FORM, abs=0)
    assert [part.source for part in got.parts] == ["statistics of 8 Ω", "statistics of 4 Ω"]


def test_one_source_has_one_number_of_degrees_of_freedom() -> None:
    with pytest.raises(ValueError, match="'meter' has 4 and 9 degrees of freedom"):
        total([known(1.0, "V", "meter", 0.1, 4), known(1.0, "V", "meter", 0.1, 9)])


def test_a_mean_lowers_the_scatter_and_not_what_is_shared() -> None:
    readings = [
        Quantity(value, "V", (Part("statistics", 0.02, 9), Part("level calibration", 0.01)))
        for value in (1.0, 1.1, 1.2, 1.3)
    ]
    got = mean(readings)
    parts = {part.source: part for part in got.parts}
    assert got.value == pytest.approx(1.15, rel=CLOSED_FORM, abs=0)
    assert parts["statistics"].u == pytest.approx(0.01, rel=CLOSED_FORM, abs=0)  # 0.02/√4
    assert parts["statistics"].dof == pytest.approx(36.0, rel=CLOSED_FORM, abs=0)  # GUM G.4.1 with four equal parts
    assert parts["level calibration"].u == pytest.approx(0.01, rel=CLOSED_FORM, abs=0)


def test_repeated_observations_scatter_about_their_mean() -> None:
    # GUM 4.2.3: s²/n with n − 1; by hand: mean 2, s² = 1, u = 1/√3
    got = observed([1.0, 2.0, 3.0], "V", "repeats")
    assert (got.value, got.dof) == (2.0, 2)
    assert got.u == pytest.approx(1.0 / math.sqrt(3.0), rel=CLOSED_FORM, abs=0)


def test_observations_that_move_together_stay_together() -> None:
    up = [1.0, 2.0, 4.0]
    both = observed_together({"a": (up, "V"), "b": ([2.0 * value for value in up], "V")}, "rows")
    nothing = difference(power(both["a"], 1.0, "V"), combined(both["b"].value / 2, "V", [(0.5, both["b"])]))
    assert nothing.u == pytest.approx(0.0, rel=0, abs=1e-15)


def test_joint_observations_have_the_degrees_of_freedom_of_their_rows() -> None:
    both = observed_together({"a": ([1.0, 2.0, 4.0], "V"), "b": ([1.0, -1.0, 0.5], "V")}, "rows")
    got = total([both["a"], both["b"]])
    assert got.dof > 2.0  # as if the joint parts were independent, which they are not
    assert settled(got).dof == 2.0
    assert settled(got).u == pytest.approx(got.u, rel=CLOSED_FORM, abs=0)
    # the sums of the rows, observed directly: 2, 1, 4.5
    assert got.u == pytest.approx(observed([2.0, 1.0, 4.5], "V", "rows").u, rel=CLOSED_FORM, abs=0)


def test_settling_leaves_single_parts_alone() -> None:
    quantity = known(1.0, "V", "meter", -0.1, 5)
    assert settled(quantity) == quantity


@pytest.mark.parametrize(
    ("wrong", "said"),
    [
        (lambda: ratio(exact(1.0, "V"), exact(0.0, "V")), "zero V has no value"),
        (lambda: total([exact(1.0, "V"), exact(1.0, "W")]), "the units are V, W"),
        (lambda: total([]), "the units are missing"),
        (lambda: mean([]), "the units are missing"),
        (lambda: power(known(0.0, "1", "noise", 1e-6), 2.0, "1"), "no first-order uncertainty; state a limit"),
        (lambda: root(known(0.0, "1", "noise", 1e-6), "1"), "no first-order uncertainty; state a limit"),
        (lambda: root(exact(-1.0, "1"), "1"), "is no real number"),
        (lambda: decibels(exact(0.0, "1")), "has no level in dB"),
        (lambda: observed([1.0], "V", "repeats"), "at least two observations"),
        (lambda: observed_together({"a": ([1.0, 2.0], "V"), "b": ([1.0], "V")}, "rows"), "equally long"),
    ],
)
def test_what_has_no_answer_is_refused_with_its_reason(wrong: object, said: str) -> None:
    assert callable(wrong)
    with pytest.raises(ValueError, match=said):
        wrong()


@given(
    st.lists(st.floats(0.5, 2.0), min_size=2, max_size=4),
    st.lists(st.floats(-0.01, 0.01), min_size=2, max_size=4),
)
def test_first_order_is_what_a_small_step_of_each_source_does(values: list[float], steps: list[float]) -> None:
    # central differences of f = v0·v1/√v0 along each source, all sources acting on both inputs
    parts = tuple(Part(f"s{k}", step) for k, step in enumerate(steps))
    first = Quantity(values[0], "V", parts)
    second = Quantity(values[1], "V", parts[::-1])
    got = ratio(product(first, second, "V²"), root(first, "V"), "V")
    for part in got.parts:
        k = next(i for i, own in enumerate(parts) if own.source == part.source)
        move = {own.source: own.u for own in second.parts}[part.source]
        h = 1e-3

        def f(sign: float, k: int = k, move: float = move, h: float = h) -> float:
            return math.sqrt(values[0] + sign * h * steps[k]) * (values[1] + sign * h * move)

        assert part.u == pytest.approx((f(1.0) - f(-1.0)) / (2.0 * h), rel=1e-6, abs=1e-12)
