"""A sine of exact phase: sample n depends on n alone, so that blocks join without a step however they are cut."""

import numpy as np

from wattproof.core.signal import Samples


def sine(frequency_hz: float, rate_hz: float, first_frame: int, frames: int, phase_cycles: float = 0.0) -> Samples:
    """Return frames samples of a sine of peak 1 from the absolute frame first_frame on, shape (frames,).

    The phase is reduced to one cycle before the sine is taken, so that it stays exact over hours.
    """
    cycles_per_frame = frequency_hz / rate_hz
    start = (first_frame * cycles_per_frame + phase_cycles) % 1.0
    cycles = (start + cycles_per_frame * np.arange(frames, dtype=np.float64)) % 1.0
    return np.asarray(np.sin(2.0 * np.pi * cycles), dtype=np.float64)
