"""The tone's complex amplitude in short overlapping pieces: where it starts, ends, steps, breaks or moves."""

from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.dsp.grid import unit_phasors
from wattproof.dsp.model import Matrix

SHORTEST_S = 0.010
LEAST_CYCLES = 4.0  # below, the window's skirt lets the sine's mirror and DC through


@attrs.frozen(eq=False)
class SubBlocks:
    """Hann-weighted pieces of `width` frames that overlap by half; piece i starts at frame i·width/2.

    `amplitude`, shape (pieces,), is complex: peak amplitude and phase against the frequency that was asked for.
    """

    amplitude: NDArray[np.complex128]
    width: int
    rate_hz: float

    @property
    def hop(self) -> int:
        """Frames from one piece to the next."""
        return self.width // 2

    @property
    def level(self) -> Samples:
        """Natural logarithm of the amplitude, shape (pieces,)."""
        return np.log(np.maximum(np.abs(self.amplitude), np.finfo(float).tiny))

    @property
    def turns(self) -> Samples:
        """Phase from each piece to the next, in rad, shape (pieces − 1,)."""
        step = self.amplitude[1:] * self.amplitude[:-1].conj()
        return np.arctan2(step.imag, step.real)


def width_for(frequency_hz: float, rate_hz: float, shortest_s: float = SHORTEST_S) -> int:
    """Return the width of a piece in frames, even: shortest_s, or 4 cycles where these take longer."""
    return 2 * int(np.ceil(max(shortest_s, LEAST_CYCLES / frequency_hz) * rate_hz / 2.0))


def sub_blocks(samples: Samples, rate_hz: float, frequency_hz: float, width: int) -> SubBlocks:
    """Demodulate samples, shape (frames,), into pieces of `width` frames (even); what fills no piece is left off.

    The carrier is frequency_hz to a billionth of the rate, so that a running tone keeps one set of weights.

    Returns no piece at all where there are fewer frames than one.
    """
    hop = width // 2
    rows = samples.size // hop
    if rows < 2:
        return SubBlocks(np.zeros(0, dtype=np.complex128), width, rate_hz)
    weights, turns = _carrier(hop, rows, round(frequency_hz / rate_hz, 9))
    halves = (samples[: rows * hop].reshape(rows, hop) @ weights).view(np.complex128)
    halves *= turns
    return SubBlocks(halves[:-1, 0] + halves[1:, 1], width, rate_hz)


@lru_cache(maxsize=16)
def _carrier(hop: int, rows: int, cycles: float) -> tuple[Matrix, NDArray[np.complex128]]:
    """Return the carrier in rising and falling Hann halves (hop, 4), and its scaled turns from row to row (rows, 1)."""
    carrier = unit_phasors(np.arange(hop, dtype=np.float64), cycles).conj()
    rise = 0.5 - 0.5 * np.cos(np.pi * np.arange(hop) / hop)
    weights = np.stack([rise * carrier, (1.0 - rise) * carrier], axis=1).view(np.float64)
    turns = unit_phasors(np.arange(rows, dtype=np.float64), cycles * hop).conj()[:, None]
    return weights, turns * (2.0 / hop)
