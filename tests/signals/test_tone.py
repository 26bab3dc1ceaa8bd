"""A tone has the phase that its frame says, however long it has sounded and however it was cut."""

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from wattproof.signals.tone import sine

_RATES = st.sampled_from([44_100.0, 48_000.0, 96_000.0, 192_000.0])
_FREQUENCIES = st.floats(20.0, 20_000.0)


def _true_sine(frequency_hz: float, rate_hz: float, frame: int) -> float:
    with mpmath.workdps(50):
        return float(mpmath.sin(2 * mpmath.pi * mpmath.mpf(frequency_hz) * frame / mpmath.mpf(rate_hz)))


@pytest.mark.parametrize("frequency_hz", [20.0, 997.0, 19_997.3])
@pytest.mark.parametrize("hours", [0.0, 1.0, 24.0])
def test_the_phase_is_exact_after_hours(frequency_hz: float, hours: float) -> None:
    rate_hz, frames = 96_000.0, 64
    first = round(hours * 3600.0 * rate_hz)
    truth = [_true_sine(frequency_hz, rate_hz, first + n) for n in range(frames)]  # mpmath, 50 digits
    # f/rate is one float64: after n frames half a step of it has grown to n·f/rate·2^-53 cycles, so to 2π·that
    cycles = (first + frames) * frequency_hz / rate_hz
    assert_allclose(
        sine(frequency_hz, rate_hz, first, frames), truth, rtol=0.0, atol=2e-15 + 8 * np.pi * cycles * 2**-53
    )


@given(_FREQUENCIES, _RATES, st.integers(0, 10**8), st.integers(1, 400), st.integers(1, 400))
def test_blocks_join_without_a_step(frequency_hz: float, rate_hz: float, first: int, one: int, two: int) -> None:
    whole = sine(frequency_hz, rate_hz, first, one + two)
    parts = [sine(frequency_hz, rate_hz, first, one), sine(frequency_hz, rate_hz, first + one, two)]
    # two roundings of the absolute phase, of first·f/rate cycles at most, each half a float64 step
    atol = 2e-12 + 4 * np.pi * (first + one + two) * frequency_hz / rate_hz * 2**-53
    assert_allclose(np.concatenate(parts), whole, rtol=0.0, atol=atol)


@given(_FREQUENCIES, _RATES, st.integers(0, 10**8))
def test_a_quarter_of_a_cycle_turns_a_sine_into_a_cosine(frequency_hz: float, rate_hz: float, first: int) -> None:
    in_phase = sine(frequency_hz, rate_hz, first, 200)
    ahead = sine(frequency_hz, rate_hz, first, 200, phase_cycles=0.25)
    # sin² + cos² = 1; the phase of both is rounded at first·f/rate cycles
    atol = 1e-12 + 8 * np.pi * first * frequency_hz / rate_hz * 2**-53
    assert_allclose(in_phase**2 + ahead**2, 1.0, rtol=0.0, atol=atol)


def test_a_tone_starts_at_its_rising_zero_crossing_with_peak_one() -> None:
    samples = sine(1000.0, 48_000.0, 0, 48)
    assert samples[0] == 0.0
    assert samples[12] == pytest.approx(1.0, rel=0.0, abs=1e-15)
    assert samples[36] == pytest.approx(-1.0, rel=0.0, abs=1e-15)
    assert samples.dtype == np.float64
