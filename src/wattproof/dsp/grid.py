"""A block of frames seen as rows × columns, so that a sine needs two short phasor vectors instead of one long one."""

import bisect
import math
from functools import lru_cache

import attrs
import numpy as np

from wattproof.core.signal import Samples

_EXACT = 2.0**26  # a frequency cut to 26 bits times a centred frame number (≤ 25 bits) is exact in float64


@lru_cache(maxsize=1)
def _smooth_numbers() -> tuple[int, ...]:
    """Return the numbers up to 2¹⁶ whose only prime factors are 2, 3 and 5, rising: an FFT likes their products."""
    top = 1 << 16
    twos = [1 << power for power in range(17)]
    threes = [two * 3**power for two in twos for power in range(11) if two * 3**power <= top]
    return tuple(sorted(three * 5**power for three in threes for power in range(7) if three * 5**power <= top))


@lru_cache(maxsize=64)
def shape_for(frames: int) -> tuple[int, int]:
    """Return (rows, columns), both 5-smooth and near √frames, whose product is at most frames and loses under 2 %.

    Raises:
        ValueError: fewer than 16 frames.
    """
    if frames < 16:
        raise ValueError(f"a block of {frames} frames is too short; it takes at least 16")
    numbers = _smooth_numbers()
    side = math.sqrt(frames)
    near = numbers[bisect.bisect_left(numbers, side / 2.0) : bisect.bisect_right(numbers, side * 2.0)]
    shapes = [(numbers[bisect.bisect_right(numbers, frames // columns) - 1], columns) for columns in near]
    return max(shapes, key=lambda shape: (shape[0] * shape[1], -abs(math.log(shape[0] / shape[1]))))


@attrs.frozen(eq=False)
class Grid:
    """Centred frame numbers of a block of rows × columns: frame = row_frame[m] + column_frame[l]."""

    rows: int
    columns: int
    row_frame: Samples
    column_frame: Samples

    @property
    def frames(self) -> int:
        """How many frames the block has."""
        return self.rows * self.columns


@lru_cache(maxsize=32)
def grid_for(frames: int) -> Grid:
    """Return the grid of the longest block of at most `frames` frames."""
    rows, columns = shape_for(frames)
    row_frame = columns * (np.arange(rows, dtype=np.float64) - (rows - 1) / 2.0)
    column_frame = np.arange(columns, dtype=np.float64) - (columns - 1) / 2.0
    return Grid(rows, columns, row_frame, column_frame)


def unit_phasors(frame: Samples, cycles_per_frame: float) -> "np.ndarray[tuple[int], np.dtype[np.complex128]]":
    """Return e^{j2π·cycles_per_frame·frame}, the phase reduced to one cycle without rounding it first."""
    coarse = round(cycles_per_frame * _EXACT) / _EXACT
    cycles = np.remainder(frame * coarse, 1.0) + frame * (cycles_per_frame - coarse)
    phasors: np.ndarray[tuple[int], np.dtype[np.complex128]] = np.exp(2j * np.pi * cycles)
    return phasors
