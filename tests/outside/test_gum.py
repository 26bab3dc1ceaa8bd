"""The uncertainty arithmetic agrees with the GUM's own examples and with a general-purpose GUM library (GTC)."""

import math

import pytest
from GTC import cos, dof, sin, type_a, uncertainty, ureal, value

from wattproof.core.quantity import Part, Quantity
from wattproof.core.rounding import t95
from wattproof.dsp.intervals import Shape, interval95, rectangular
from wattproof.dsp.uncertainty import (
    combined,
    difference,
    exact,
    known,
    observed_together,
    power,
    product,
    ratio,
    settled,
    total,
)

SAME = 1e-9  # two double-precision routes to one number

# JCGM 100:2008, H.2, table H.2
VOLT = (5.007, 4.994, 5.005, 4.990, 4.999)
AMPERE = (19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3)
PHASE = (1.0456, 1.0438, 1.0468, 1.0428, 1.0433)


def end_gauge() -> Quantity:
    """JCGM 100:2008, H.1: l = l_S + d − l_S(δα·θ + α_S·δθ), in nm."""
    standard = known(50_000_623.0, "nm", "standard", 25.0, 18)
    d = Quantity(215.0, "nm", (Part("repeats", 5.8, 24), Part("random", 3.9, 5), Part("systematic", 6.7, 8)))
    d_alpha = known(0.0, "1/K", "expansion", rectangular(1e-6), 50)
    theta = known(-0.1, "K", "temperature", 0.41)
    alpha = known(11.5e-6, "1/K", "coefficient", rectangular(2e-6))
    d_theta = known(0.0, "K", "difference", rectangular(0.05), 2)
    expansion = total([product(d_alpha, theta, "1"), product(alpha, d_theta, "1")])
    return difference(total([standard, d]), product(standard, expansion, "nm"))


def test_the_end_gauge_of_the_gum() -> None:
    got = end_gauge()
    # JCGM 100:2008, H.1: 50 000 838 nm, u_c 32 nm, ν_eff 16.7, taken as 16, k95 = 2.12
    assert got.value == pytest.approx(50_000_838.0, rel=0, abs=1e-6)
    assert round(got.u) == 32
    assert f"{math.floor(10 * got.dof) / 10:g}" == "16.7"
    assert t95(got.dof) == pytest.approx(2.12, rel=0, abs=5e-3)
    # unrounded: three general libraries
    assert got.u == pytest.approx(31.663879, rel=0, abs=5e-7)
    assert got.dof == pytest.approx(16.751856, rel=0, abs=5e-7)


def test_the_end_gauge_by_the_library() -> None:
    standard = ureal(50_000_623.0, 25.0, 18)
    d = ureal(215.0, 5.8, 24) + ureal(0.0, 3.9, 5) + ureal(0.0, 6.7, 8)
    d_alpha, theta = ureal(0.0, 1e-6 / math.sqrt(3.0), 50), ureal(-0.1, 0.41)
    alpha, d_theta = ureal(11.5e-6, 2e-6 / math.sqrt(3.0)), ureal(0.0, 0.05 / math.sqrt(3.0), 2)
    theirs = standard + d - standard * (d_alpha * theta + alpha * d_theta)
    ours = end_gauge()
    assert ours.value == pytest.approx(value(theirs), rel=SAME, abs=0)
    assert ours.u == pytest.approx(uncertainty(theirs), rel=SAME, abs=0)
    assert ours.dof == pytest.approx(dof(theirs), rel=SAME, abs=0)


def impedance() -> dict[str, Quantity]:
    """JCGM 100:2008, H.2: R = (V/I) cos φ, X = (V/I) sin φ, Z = V/I, from simultaneous observations."""
    seen = observed_together({"V": (VOLT, "V"), "I": (AMPERE, "A"), "phase": (PHASE, "rad")}, "observations")
    z = ratio(seen["V"], seen["I"], "Ω")
    phase = seen["phase"]
    cosine = combined(math.cos(phase.value), "1", [(-math.sin(phase.value), phase)])
    sine = combined(math.sin(phase.value), "1", [(math.cos(phase.value), phase)])
    return seen | {"R": product(z, cosine, "Ω"), "X": product(z, sine, "Ω"), "Z": z}


def correlation(first: Quantity, second: Quantity) -> float:
    """Return r from the parts that two quantities share (GUM 5.2.2)."""
    mine = {part.source: part.u for part in first.parts}
    theirs = {part.source: part.u for part in second.parts}
    return sum(u * theirs.get(source, 0.0) for source, u in mine.items()) / (first.u * second.u)


@pytest.mark.parametrize(
    ("name", "expected", "u", "published"),
    [
        # unrounded from the five rows: GTC and uncertainties; published: JCGM 100:2008, tables H.2 and H.3
        ("V", 4.9990, 0.0032094, "0.0032"),
        ("I", 0.019661, 9.471e-6, "9.5e-06"),
        ("phase", 1.04446, 0.00075206, "0.00075"),
        ("R", 127.73217, 0.071071, "0.071"),
        ("X", 219.84651, 0.295582, None),  # published 0.295: computed there from rounded values
        ("Z", 254.25970, 0.236336, None),  # published 0.236
    ],
)
def test_the_impedance_of_the_gum(name: str, expected: float, u: float, published: str | None) -> None:
    got = impedance()[name]
    assert got.value == pytest.approx(expected, rel=0, abs=5e-6)
    assert got.u == pytest.approx(u, rel=1e-4, abs=0)  # the digits that are given
    if published is not None:
        assert f"{got.u:.2g}" == published


def test_the_impedance_s_correlations() -> None:
    got = impedance()
    # JCGM 100:2008, table H.2: −0.36, 0.86, −0.65; unrounded by general libraries
    assert correlation(got["V"], got["I"]) == pytest.approx(-0.3553, rel=0, abs=5e-5)
    assert correlation(got["V"], got["phase"]) == pytest.approx(0.8576, rel=0, abs=5e-5)
    assert correlation(got["I"], got["phase"]) == pytest.approx(-0.6451, rel=0, abs=5e-5)
    assert correlation(got["R"], got["X"]) == pytest.approx(-0.588430, rel=0, abs=5e-7)
    assert correlation(got["R"], got["Z"]) == pytest.approx(-0.485259, rel=0, abs=5e-7)
    assert correlation(got["X"], got["Z"]) == pytest.approx(0.992512, rel=0, abs=5e-7)


def test_the_impedance_by_the_library() -> None:
    v, i, phase = type_a.multi_estimate_real((VOLT, AMPERE, PHASE))
    theirs = {"R": v / i * cos(phase), "X": v / i * sin(phase), "Z": v / i}
    ours = impedance()
    for name, their in theirs.items():
        mine = settled(ours[name])
        assert mine.value == pytest.approx(value(their), rel=SAME, abs=0)
        assert mine.u == pytest.approx(uncertainty(their), rel=SAME, abs=0)
        assert mine.dof == pytest.approx(dof(their), rel=SAME, abs=0)  # 4: five rows


def test_ignoring_the_correlation_would_be_wrong_both_ways() -> None:
    alone = {
        name: known(q.value, q.unit, name, q.u, 4) for name, q in impedance().items() if name in {"V", "I", "phase"}
    }
    z = ratio(alone["V"], alone["I"], "Ω")
    phase = alone["phase"]
    resistance = product(z, combined(math.cos(phase.value), "1", [(-math.sin(phase.value), phase)]), "Ω")
    # by general libraries with r = 0: 0.194 54 Ω instead of 0.071; Z 0.204 08 instead of 0.236
    assert resistance.u == pytest.approx(0.19454, rel=0, abs=5e-6)
    assert z.u == pytest.approx(0.20408, rel=0, abs=5e-6)


def test_power_from_voltage_and_load() -> None:
    # P = V²/R with V = 20.00 V (u 0.04, ν 9), R = 8.00 Ω (u 0.08): closed form √((2·0.04·20/8)² + (0.08·400/64)²)
    got = ratio(power(known(20.0, "V", "meter", 0.04, 9), 2.0, "V²"), known(8.0, "Ω", "load", 0.08), "W")
    theirs = ureal(20.0, 0.04, 9) ** 2 / ureal(8.0, 0.08)
    assert (got.value, got.unit) == (50.0, "W")
    assert got.u == pytest.approx(0.53852, rel=0, abs=5e-6)
    assert got.u == pytest.approx(uncertainty(theirs), rel=SAME, abs=0)
    assert got.dof == pytest.approx(473.06, rel=0, abs=5e-3)
    assert got.dof == pytest.approx(dof(theirs), rel=SAME, abs=0)


def test_a_ratio_of_two_powers_loses_the_shared_calibration_as_in_the_library() -> None:
    gain, left, right = ureal(1.0, 0.01), ureal(20.0, 0.02, 12), ureal(14.0, 0.02, 12)
    theirs = (gain * left) ** 2 / (gain * right) ** 2
    scale = known(1.0, "1", "level calibration", 0.01)
    first = product(scale, known(20.0, "V", "scatter left", 0.02, 12), "V")
    second = product(scale, known(14.0, "V", "scatter right", 0.02, 12), "V")
    ours = ratio(power(first, 2.0, "V²"), power(second, 2.0, "V²"))
    assert ours.value == pytest.approx(value(theirs), rel=SAME, abs=0)
    assert ours.u == pytest.approx(uncertainty(theirs), rel=SAME, abs=0)
    assert ours.dof == pytest.approx(dof(theirs), rel=1e-6, abs=0)  # theirs keeps a remainder of the calibration


@pytest.mark.parametrize(
    ("shape", "half_width"),
    [
        (Shape.NORMAL, 3.92),  # JCGM 101:2008, 9.2.2: sum of four inputs with u = 1 each
        (Shape.RECTANGULAR, 3.88),  # JCGM 101:2008, 9.2.3
    ],
)
def test_the_additive_model_of_jcgm_101(shape: Shape, half_width: float) -> None:
    inputs = [known(0.0, "1", f"x{k}", 1.0) for k in range(4)]
    got = total(inputs)
    assert got.u == pytest.approx(2.0, rel=1e-12, abs=0)
    interval = interval95(got, dict.fromkeys((f"x{k}" for k in range(4)), shape))
    assert round(interval.half_width, 2) == half_width


def test_squares_about_zero_are_refused_where_first_order_fails() -> None:
    # JCGM 101:2008, 9.4: y = x1² + x2² about zero has u = 0 to first order, and 50e-6 in truth
    with pytest.raises(ValueError, match="no first-order uncertainty"):
        power(known(0.0, "1", "x1", 0.005), 2.0, "1")
    assert power(exact(0.0, "1"), 2.0, "1").u == 0.0
