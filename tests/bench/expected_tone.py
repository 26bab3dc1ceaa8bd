"""What a ramped tone must be, sample by sample, by whole-number phase and the definition of the raised cosine."""

import math

import numpy as np
from numpy.typing import NDArray

RAMP_S = 0.010
CYCLE = 131_072  # frequencies of the tests are whole multiples of rate / CYCLE, so that every phase is exact


def sine(steps: int, first: int, frames: int) -> NDArray[np.float64]:
    """A sine of `steps` / CYCLE cycles per frame from its frame `first` on; phases run from -1/2 to below 1/2 cycle."""
    table = np.array([math.sin(2.0 * math.pi * at / CYCLE) for at in range(-CYCLE // 2, CYCLE // 2)])
    return np.asarray(table[(np.arange(first, first + frames) * steps + CYCLE // 2) % CYCLE])


def ramp(frames: int) -> NDArray[np.float64]:
    """The rise of a raised cosine: its last value is 1."""
    return np.array([0.5 * (1.0 - math.cos(math.pi * at / frames)) for at in range(1, frames + 1)])


def largest_step(peak: float, frequency_hz: float, rate_hz: float) -> float:
    """The most that a ramped tone moves from one sample to the next.

    Closed form: |g(n)·s(n) − g(n−1)·s(n−1)| ≤ |Δs| + |Δg|, Δs ≤ 2 sin(π f / rate), Δg ≤ π / (2 · ramp frames).
    """
    return peak * (2.0 * math.sin(math.pi * frequency_hz / rate_hz) + math.pi / (2.0 * RAMP_S * rate_hz))
