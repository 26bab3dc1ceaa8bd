"""A first-order recursion over one chunk without a loop: s[n] = a·s[n-1] + (1 - a)·x[n]."""

import numpy as np

from wattproof.core.signal import Samples


class Smoother:
    """A first-order low-pass that remembers its state from chunk to chunk, along the last axis.

    The recursion is written as a running sum of x[k]·a^(-k), scaled back by a^n; within a chunk of a few time
    constants that costs no accuracy (a^n stays above 1e-3 for what is used here).
    """

    def __init__(self, time_constant_frames: float, frames: int, shape: tuple[int, ...] = ()) -> None:
        decay = np.exp(-1.0 / time_constant_frames)
        self.high_pass_gain = float(0.5 * (1.0 + decay) / decay)  # makes x - s reach 1 at half the rate
        self._powers = decay ** np.arange(1, frames + 1)
        self._share = (1.0 - decay) / self._powers
        self.state: Samples = np.zeros(shape)

    def push(self, chunk: Samples) -> Samples:
        """Return the smoothed chunk, of the same shape."""
        sums = np.cumsum(chunk * self._share, axis=-1)
        sums += self.state[..., None]
        sums *= self._powers
        self.state = sums[..., -1].copy()
        return sums
