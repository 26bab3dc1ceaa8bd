"""The last seconds of what was captured, by absolute frame; older frames are overwritten."""

import numpy as np

from wattproof.core.signal import Samples


class History:
    """A ring of captured frames, shape (size, channels). Its owner guards it with a lock."""

    def __init__(self, frames: int, channels: int) -> None:
        self._ring: Samples = np.zeros((frames, channels))
        self.start = 0  # the oldest absolute frame ever written, where a stretch was skipped
        self.end = 0

    @property
    def oldest(self) -> int:
        """The oldest absolute frame that can still be had."""
        return max(self.start, self.end - int(self._ring.shape[0]))

    def append(self, samples: Samples) -> None:
        """Write the next frames."""
        size, count = self._ring.shape[0], samples.shape[0]
        slot = self.end % size
        head = min(count, size - slot)
        self._ring[slot : slot + head] = samples[:head]
        self._ring[: count - head] = samples[head:]
        self.end += count

    def skip_to(self, frame: int) -> None:
        """Go on at a later frame; what lies between was never captured."""
        self.start = self.end = frame

    def read(self, first_frame: int, frames: int) -> Samples:
        """Return a copy of frames that are all there (the caller has checked against `oldest` and `end`)."""
        size = self._ring.shape[0]
        slot = first_frame % size
        head = min(frames, size - slot)
        return np.concatenate([self._ring[slot : slot + head], self._ring[: frames - head]])
