"""The smooth start and end of a tone, so that nothing clicks."""

import numpy as np

from wattproof.core.signal import Samples

RAMP_S = 0.010  # common practice, no source: 5 to 20 ms; long enough for no click, short enough to mute within 0.1 s


def raised_cosine(frames: int) -> Samples:
    """Return a rise from above 0 to 1, shape (frames,): half a period of a cosine, ending at exactly 1."""
    return 0.5 - 0.5 * np.cos(np.pi * np.arange(1, frames + 1) / frames)
