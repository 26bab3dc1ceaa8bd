"""The exponential sweep: where its frequency is, that it starts and ends softly, and what it refuses."""

import math

import numpy as np
import pytest

from wattproof.core.signal import Sweep
from wattproof.signals.sweep import sweep_samples

RATE_HZ = 48_000.0
SWEEP = Sweep(20.0, 0.5, end_hz=5_120.0, seconds=2.0)  # eight octaves in 2 s


def test_each_octave_takes_equally_long() -> None:
    samples = sweep_samples(SWEEP, RATE_HZ)
    rising = np.flatnonzero((samples[:-1] < 0.0) & (samples[1:] >= 0.0))
    share = -samples[rising] / (samples[rising + 1] - samples[rising])
    crossings_s = (rising + share) / RATE_HZ
    middle_s = (crossings_s[1:] + crossings_s[:-1]) / 2.0
    frequency_hz = 1.0 / np.diff(crossings_s)
    # closed form: f(t) = start·(end/start)^(t/T); a period's mean frequency is that at its middle to second order in
    # (period/e-fold)², 0.5 % at 160 Hz
    late = (middle_s > 0.75) & (middle_s < 1.95)
    expected = 20.0 * 256.0 ** (middle_s[late] / 2.0)
    np.testing.assert_allclose(frequency_hz[late], expected, rtol=5e-3, atol=0.0)


def test_it_never_exceeds_its_level_and_both_ends_are_ramps() -> None:
    samples = sweep_samples(SWEEP, RATE_HZ)
    assert samples.size == 2 * RATE_HZ
    assert np.max(np.abs(samples)) <= 0.5
    assert abs(samples[-1]) < 1e-4  # the last of a raised cosine over 480 frames: 0.5·(π/2/480)²
    assert np.max(np.abs(samples[-24:])) < 0.01  # a twentieth of the ramp: 0.5·sin²(π/40) = 0.003


@pytest.mark.parametrize(("end_hz", "seconds"), [(24_000.0, 1.0), (5_000.0, 0.01)])
def test_what_does_not_fit_is_refused(end_hz: float, seconds: float) -> None:
    with pytest.raises(ValueError, match=r"half the rate|ramps"):
        sweep_samples(Sweep(20.0, 0.5, end_hz=end_hz, seconds=seconds), RATE_HZ)


def test_a_sweep_rises() -> None:
    with pytest.raises(ValueError, match="must rise"):
        Sweep(100.0, 0.5, end_hz=100.0, seconds=1.0)
    assert math.isclose(Sweep(100.0, 0.5, end_hz=101.0, seconds=1.0).end_hz, 101.0, rel_tol=0.0, abs_tol=0.0)
