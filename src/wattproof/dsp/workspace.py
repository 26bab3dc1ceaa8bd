"""Arrays that a running reader fills again and again: pages of fresh ones would cost it more than its arithmetic."""

import numpy as np

from wattproof.dsp.model import Matrix

# GNU's malloc hands the pages of large arrays back at once, and every FFT then faults them in anew, at three times the
# cost of its arithmetic. What counts as large grows with what was freed: mallopt(3), M_MMAP_THRESHOLD, "dynamic mmap
# threshold". One array that comes and goes (24 MB, never touched; the limit is 32 MB) raises it. Elsewhere it is idle.
_SEEN_FREED = 3 << 20


class Workspace:
    """Keeps one array per name. What was computed in them holds until the next block is read."""

    def __init__(self) -> None:
        np.empty(_SEEN_FREED)
        self._arrays: dict[str, Matrix] = {}

    def array(self, name: str, shape: tuple[int, ...]) -> Matrix:
        """Return the array of this name with undefined content; a new one where the shape has changed."""
        array = self._arrays.get(name)
        if array is None or array.shape != shape:
            array = self._arrays[name] = np.empty(shape)
        return array
