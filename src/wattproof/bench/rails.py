"""Finds the runs of samples that stand at a converter's rails, judged on raw samples before any filter."""

import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Overload, Samples

MOST_RUNS = 10_000  # enough for any sentence; a square wave at the rails would else give one object per half cycle


def integer_rails(bits: int) -> tuple[float, float]:
    """Return the lowest and the highest code of a two's complement converter, in full-scale units."""
    return -1.0, 1.0 - 2.0 ** (1 - bits)


def rail_runs(  # noqa: PLR0913 - two rails and where the samples stand
    samples: Samples,
    low: float,
    high: float,
    *,
    first_frame: int = 0,
    at_least: int = 2,
    most: int = MOST_RUNS,
) -> tuple[Overload, ...]:
    """Return the runs of at_least frames and more at or beyond a rail, by channel, then by frame.

    `samples` has shape (frames, channels) in full-scale units; `first_frame` is the absolute frame of the first row.
    A run is a stretch of consecutive frames of one channel that stand at a rail. At most `most` runs are returned.
    """
    runs: list[Overload] = []
    for channel in range(samples.shape[1]):
        column = samples[:, channel]
        if column.size == 0 or (column.max() < high and column.min() > low):
            continue
        starts, ends = _runs((column >= high) | (column <= low))
        long = (ends - starts) >= at_least
        for start, end in zip(starts[long].tolist(), ends[long].tolist(), strict=True):
            if len(runs) == most:
                return tuple(runs)
            runs.append(Overload(channel + 1, first_frame + start, end - start))
    return tuple(runs)


def _runs(at_rail: NDArray[np.bool_]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return the first index of each run of True, and the index after its last."""
    padded = np.zeros(at_rail.size + 2, dtype=np.int8)
    padded[1:-1] = at_rail
    edges = np.flatnonzero(np.diff(padded)).astype(np.int64)
    return edges[0::2], edges[1::2]
