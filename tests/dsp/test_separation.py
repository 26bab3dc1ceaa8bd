"""Converter-out and converter-in told apart, against polynomials whose harmonics are closed forms."""

import cmath
import math

import numpy as np
import pytest

from wattproof.core.quantity import measured
from wattproof.core.reading import ReadingSettings, Reference
from wattproof.core.signal import Capture, Samples
from wattproof.dsp.live import LiveReader
from wattproof.dsp.separation import Line, averaged, separated, separated_noise

RATE_HZ, FRAMES = 48_000.0, 24_000


def bent(x: Samples, second: float, third: float) -> Samples:
    """Harmonics of second and third at peak 1: sin² holds half a second, sin³ a quarter of a third (closed form)."""
    return x + 2.0 * second * x**2 + 4.0 * third * x**3


def loop(drive_fs: float, pad: float) -> Samples:
    theta = 2.0 * np.pi * 997.0 * np.arange(FRAMES) / RATE_HZ
    played = bent(drive_fs * np.sin(theta), 3e-5, 2e-5)
    rng = np.random.default_rng(round(1000 * drive_fs * pad))
    return bent(pad * played, -2e-5, -3e-5) + 1e-8 * rng.standard_normal(FRAMES)


def lines_of(samples: Samples) -> dict[int, Line]:
    reader = LiveReader(RATE_HZ, (ReadingSettings(reference=Reference.FUNDAMENTAL),))
    reader.restart(997.0)
    (reading,), _ = reader.take(Capture(samples[:, None], RATE_HZ))
    return dict(averaged([reading]))


@pytest.mark.parametrize("pad", [0.1, 10.0 ** (-30.0 / 20.0)])
def test_a_pad_tells_the_converters_apart_even_where_they_cancel(pad: float) -> None:
    drive = 0.5
    own = {each.order: each for each in separated(lines_of(loop(drive, 1.0)), lines_of(loop(drive, pad)), pad)}
    # |out| and |in| at half of full scale: h2 halves, h3 quarters; 1 % for noise and for what one bends of the other
    assert own[2].out.value == pytest.approx(1.5e-5, rel=0.01, abs=0.0)
    assert own[2].into.value == pytest.approx(1.0e-5, rel=0.01, abs=0.0)
    assert own[3].out.value == pytest.approx(5e-6, rel=0.01, abs=0.0)
    assert own[3].into.value == pytest.approx(7.5e-6, rel=0.01, abs=0.0)
    # they stand against each other, which one loop shows as less than either
    assert math.cos(own[2].out_phase_rad - own[2].into_phase_rad) == pytest.approx(-1.0, rel=0.0, abs=1e-3)


def test_the_sums_are_the_algebra_of_two_equations() -> None:
    out, into, left = cmath.rect(2e-6, 0.4), cmath.rect(3e-6, 2.0), 0.01
    direct, padded = Line(out + into, 1e-8), Line(out + left * into, 2e-8)
    (own,) = separated({3: direct}, {3: padded}, 0.1)
    assert own.out.value == pytest.approx(2e-6, rel=1e-12, abs=0.0)
    assert own.into.value == pytest.approx(3e-6, rel=1e-12, abs=0.0)
    assert own.into_phase_rad == pytest.approx(2.0, rel=1e-12, abs=0.0)
    law = 0.01 * 3e-6 / math.sqrt(3.0)
    assert own.into.u == pytest.approx(math.hypot(math.hypot(1e-8, 2e-8) / 0.99, law), rel=1e-9, abs=0.0)


def test_a_pad_of_less_than_ten_decibels_is_refused() -> None:
    with pytest.raises(ValueError, match="20 to 30 dB"):
        separated({2: Line(1e-6, 0.0)}, {2: Line(1e-6, 0.0)}, 0.5)


def test_noise_is_told_apart_in_power() -> None:
    out, into, gain, pad = 3e-6, 2e-6, 1.4, 0.1
    direct = measured(math.hypot(gain * out, into), 1e-9, "1")
    padded = measured(math.hypot(gain * pad * out, into), 1e-9, "1")
    found_out, found_in = separated_noise(direct, padded, gain, pad)
    assert found_out.value == pytest.approx(out, rel=1e-9, abs=0.0)
    assert found_in.value == pytest.approx(into, rel=1e-9, abs=0.0)
    assert 0.0 < found_out.u < 1e-8


def test_noise_that_is_drowned_comes_out_as_nothing_with_its_doubt() -> None:
    found_out, _ = separated_noise(measured(1e-6, 1e-8, "1"), measured(1.001e-6, 1e-8, "1"), 1.0, 0.1)
    assert found_out.value == 0.0
    assert found_out.u > 1e-7
