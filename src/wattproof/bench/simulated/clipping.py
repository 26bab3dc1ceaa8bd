"""Clipping at the supply: straight, a parabola in the corner, flat. Sampled so that its edges do not alias.

What is cut off is averaged over the way from one sample to the next, by differences of its integral.
That average is a box filter whose zeros lie where the raised sample rate would fold harmonics into the band (J. D.
Parker, V. Zavalishin and E. Le Bivic, "Reducing the aliasing of nonlinear waveshaping using continuous-time
convolution", DAFx-16).
"""

import numpy as np

from wattproof.core.signal import Samples

Limit = float | Samples  # V, positive; broadcasts against (channels, frames)
STANDS_STILL = 1e-4  # of the limit: below that step the difference quotient is less exact than the value itself


def cut_off(excess_v: Samples, knee_v: Limit) -> Samples:
    """Return what clipping takes away, given how far the wanted voltage is beyond the corner's start.

    Nothing below 0, excess²/(4·knee) up to 2·knee, and everything but `knee_v` beyond.
    """
    corner = np.clip(excess_v, 0.0, 2.0 * knee_v)
    return np.asarray(np.maximum(excess_v - 2.0 * knee_v, 0.0) + corner * corner / (4.0 * knee_v), dtype=np.float64)


def _integral(excess_v: Samples, knee_v: Limit) -> Samples:
    """Return the integral of cut_off from 0 to excess_v."""
    corner = np.clip(excess_v, 0.0, 2.0 * knee_v)
    beyond = np.maximum(excess_v - 2.0 * knee_v, 0.0)
    return np.asarray(
        corner * corner * corner / (12.0 * knee_v) + beyond * (knee_v + 0.5 * beyond),
        dtype=np.float64,
    )


def clipped(wanted_v: Samples, upper_v: Limit, lower_v: Limit, knee: float) -> Samples:
    """Return the static curve: straight up to limit·(1 - knee), flat at the limit from limit·(1 + knee) on."""
    above = cut_off(wanted_v - (1.0 - knee) * upper_v, knee * upper_v)
    below = cut_off(-wanted_v - (1.0 - knee) * lower_v, knee * lower_v)
    return wanted_v - above + below


class Clipper:
    """The same curve over chunks of shape (channels, frames), LATE frames late, with its aliases averaged away."""

    LATE = 2

    def __init__(self, channels: int, knee: float) -> None:
        self._knee = knee
        self._last: Samples = np.zeros((channels, 2 * self.LATE))

    def push(self, wanted_v: Samples, upper_v: Limit, lower_v: Limit) -> Samples:
        """Return the next chunk for limits that are constant, shape (channels, 1), or one per frame."""
        path = np.concatenate([self._last, wanted_v], axis=1)
        self._last = path[:, -2 * self.LATE :]
        middle = path[:, self.LATE : -self.LATE].copy()
        if float(path.max()) > (1.0 - self._knee) * float(np.min(upper_v)):
            middle -= self._cut_off(path, upper_v)
        if float(path.min()) < -(1.0 - self._knee) * float(np.min(lower_v)):
            middle += self._cut_off(-path, lower_v)
        return middle

    def _cut_off(self, path: Samples, limit_v: Limit) -> Samples:
        """Return what is cut off above limit_v, shape (channels, frames), for a path of 2·LATE frames more.

        The mean of the averages over the steps before and after a frame lets sin(ωT)/(ωT) = 1 - (ωT)²/6 + … through; a
        sixth of the second difference gives the (ωT)²/6 back. While a limit moves, some ms, aliases are let be.
        """
        if np.shape(limit_v)[-1:] not in {(), (1,)}:
            inside = path[:, self.LATE : -self.LATE]
            return cut_off(inside - (1.0 - self._knee) * limit_v, self._knee * limit_v)
        steps = self._averages(path, limit_v)
        near = steps[:, 1:-2] + steps[:, 2:-1]
        near *= 7.0 / 12.0
        near -= (steps[:, :-3] + steps[:, 3:]) / 12.0
        return near

    def _averages(self, path: Samples, limit_v: Limit) -> Samples:
        """Return what is cut off above a constant limit, averaged over each step of the path."""
        averages = np.zeros((path.shape[0], path.shape[1] - 1))
        limits_v = np.broadcast_to(limit_v, (path.shape[0], 1))[:, 0]
        for excess, average, limit in zip(path - (1.0 - self._knee) * limit_v, averages, limits_v, strict=True):
            beyond = np.flatnonzero(np.maximum(excess[1:], excess[:-1]) > 0.0)
            average[beyond] = _average(excess[beyond], excess[beyond + 1], self._knee * limit, STANDS_STILL * limit)
        return averages


def _average(start: Samples, end: Samples, knee_v: float, still_v: float) -> Samples:
    """Return the average of cut_off over straight ways from start to end; the middle's where a way is below still_v."""
    way = end - start
    still = np.abs(way) < still_v
    way[still] = 1.0
    average = (_integral(end, knee_v) - _integral(start, knee_v)) / way
    average[still] = cut_off(0.5 * (start[still] + end[still]), knee_v)
    return np.asarray(average, dtype=np.float64)
