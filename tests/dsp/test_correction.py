"""What is taken out of a reading, what becomes a limit, and where a phasor may be subtracted."""

import math

import numpy as np
import pytest

from wattproof.core.loopback import Response
from wattproof.core.quantity import measured
from wattproof.dsp.correction import State, in_reach, levelled, limit, without_own_line, without_own_noise
from wattproof.dsp.sources import INTERFACE

BENT = Response(np.array([100.0, 1_000.0, 10_000.0]), np.array([1.0, 1.0, 0.9], dtype=complex))


def test_the_input_has_half_of_a_loops_bend_give_or_take_that_half() -> None:
    corrected = levelled(measured(0.01, 0.0, "1"), BENT, 10_000.0, 1_000.0, 1)
    assert corrected.value == pytest.approx(0.01 / math.sqrt(0.9), rel=1e-12, abs=0.0)
    half_width = corrected.u * math.sqrt(3.0)  # rectangular, GUM 4.3.7
    assert half_width / corrected.value == pytest.approx(-math.log(0.9) / 2.0, rel=1e-9, abs=0.0)


def test_without_a_response_nothing_is_corrected() -> None:
    ratio = measured(0.01, 1e-5, "1")
    assert levelled(ratio, Response(), 10_000.0, 1_000.0, 1) == ratio


def test_noise_is_subtracted_in_power_with_its_doubt() -> None:
    # 10 dB above the own noise: what is left is √0.9 of it; u from both, by hand
    left = without_own_noise(measured(1.0, 0.01, "1"), measured(10.0**-0.5, 0.02, "1"))
    assert left.value == pytest.approx(math.sqrt(0.9), rel=1e-12, abs=0.0)
    assert left.u == pytest.approx(math.hypot(0.01, 0.02 * 10.0**-0.5) / math.sqrt(0.9), rel=1e-9, abs=0.0)
    assert left.limited_by is None


@pytest.mark.parametrize("above_db", [0.0, 0.5, 0.9])
def test_less_than_a_decibel_above_the_own_noise_it_is_a_limit(above_db: float) -> None:
    left = without_own_noise(measured(10.0 ** (above_db / 20.0), 0.001, "1"), measured(1.0, 0.001, "1"))
    assert left.limited_by == INTERFACE
    assert left.value == pytest.approx(10.0 ** (above_db / 20.0) + 0.002, rel=1e-12, abs=0.0)


def test_a_limit_is_what_was_seen_and_the_own_share_and_two_u() -> None:
    assert limit(measured(4e-6, 1e-7, "1"), 3e-6).value == pytest.approx(7.2e-6, rel=1e-12, abs=0.0)
    assert in_reach(measured(4e-6, 1e-7, "1"), 3e-6)
    assert not in_reach(measured(9e-6, 1e-7, "1"), 3e-6)


def test_a_phasor_is_subtracted_in_the_same_state_only() -> None:
    here = State(drive_fs=0.5, input_fs=0.5, gain_setting="12 o'clock")
    near = State(0.5 * 1.005, 0.5 / 1.005, "12 o'clock")
    assert without_own_line(1e-5 + 2e-6j, 1e-5 + 0j, here, near) == pytest.approx(2e-6j, rel=1e-9, abs=0.0)
    for other in (State(0.25, 0.5, "12 o'clock"), State(0.5, 0.52, "12 o'clock"), State(0.5, 0.5, "1 o'clock")):
        assert without_own_line(1e-5 + 0j, 1e-5 + 0j, here, other) is None


def test_a_twentieth_of_a_decibel_still_cancels_a_third_harmonic_by_38_db() -> None:
    # suppression = −20·lg|1 − 10^((k−1)·ΔL/20)| for k = 3 and ΔL = 0.05 dB (closed form)
    left = abs(1.0 - 10.0 ** (2.0 * 0.05 / 20.0))
    assert -20.0 * math.log10(left) == pytest.approx(38.7, rel=0.0, abs=0.1)
