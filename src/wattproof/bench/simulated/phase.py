"""An oscillator of exact phase: an integer accumulator that wraps, so that nothing drifts however long it runs."""

from fractions import Fraction
from functools import lru_cache

import numpy as np

from wattproof.core.signal import Samples

_TURN = 1 << 64  # one cycle, as the 64-bit accumulator counts it


@lru_cache(maxsize=64)
def _step(frequency_hz: float, rate_hz: float) -> int:
    """Return by how much the accumulator advances a frame: exact to half of its last bit."""
    return round(Fraction(frequency_hz) / Fraction(rate_hz) * _TURN) % _TURN


def oscillate(frequency_hz: float, rate_hz: float, first_frame: int, frames: int) -> Samples:
    """Return a sine of peak 1 from the absolute frame first_frame on, shape (frames,); its phase is 0 at frame 0."""
    step = _step(frequency_hz, rate_hz)
    start = np.uint64(first_frame * step % _TURN)
    turns = start + np.uint64(step) * np.arange(frames, dtype=np.uint64)
    return np.asarray(np.sin(turns.astype(np.float64) * (2.0 * np.pi / _TURN)), dtype=np.float64)


def lines(parts: tuple[tuple[float, float], ...], rate_hz: float, first_frame: int, frames: int) -> Samples:
    """Return the sum of sines given as (frequency in Hz, peak); those above 0.49 of the rate are left out."""
    total = np.zeros(frames)
    for frequency_hz, peak in parts:
        if frequency_hz < 0.49 * rate_hz:
            total += peak * oscillate(frequency_hz, rate_hz, first_frame, frames)
    return total
