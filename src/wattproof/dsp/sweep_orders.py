"""Harmonic distortion by order from one exponential sweep: in its deconvolution each order arrives earlier.

The k-th harmonic of an exponential sweep is that sweep itself, earlier by L·ln k, L being the time of an e-fold rise of
its frequency (A. Farina, AES 108th Convention, 2000, preprint 5093). So the quotient of the spectra holds one impulse
response for each order, and a window around each tells them apart.
"""

import math

import attrs
import numpy as np

from wattproof.core.signal import Samples, Sweep

_WEAKEST = 1e-6  # of the strongest line's power, as in `dsp.sweep`
_SHARE = 0.45  # of the time to the next order that a window reaches
_EDGE = 0.3  # of the window that is tapered at each end
_AVERAGED = 2.0 ** (1.0 / 24.0)  # to both sides of a frequency: a twelfth of an octave in all


@attrs.frozen(eq=False)
class Order:
    """One order: `ratio` (points,) of its amplitude to that of the played tone, and the noise that stands there."""

    order: int
    frequency_hz: Samples  # of the fundamental
    ratio: Samples
    noise: Samples


def orders_of(  # noqa: PLR0913, PLR0917 - what was played, what came, and where to look
    captured: Samples, played: Samples, sweep: Sweep, rate_hz: float, delay_frames: float, at_hz: Samples, most: int
) -> tuple[Order, ...]:
    """Return orders 2 to most at fundamentals at_hz, as full scales captured per full scale played.

    `captured` and `played` have shape (frames,) and begin at the same moment; `delay_frames` is the linear path's.
    Fundamentals whose harmonic lies beyond the sweep's end are left out.
    """
    size = 1 << (2 * captured.size - 1).bit_length()
    sent, came = np.fft.rfft(played, size), np.fft.rfft(captured, size)
    power = sent.real**2 + sent.imag**2
    inside = power > _WEAKEST * float(power.max())
    impulse = np.fft.irfft(np.where(inside, came * np.conj(sent) / np.where(inside, power, 1.0), 0.0), size)
    e_fold = sweep.seconds / math.log(sweep.end_hz / sweep.frequency_hz) * rate_hz  # frames
    quiet_at = delay_frames + e_fold * math.log(2.0)  # where only noise and the end of the linear answer are left
    found = []
    for order in range(2, most + 1):
        at = delay_frames - e_fold * math.log(order)
        reach = _SHARE * e_fold * math.log((order + 1.0) / order)
        known = at_hz[at_hz * order < 0.98 * sweep.end_hz]
        heard = _windowed(impulse, at, reach, rate_hz, known * order)
        noise = _windowed(impulse, quiet_at, reach, rate_hz, known * order)
        found.append(Order(order, known, np.sqrt(np.maximum(heard**2 - noise**2, 0.0)), noise))
    return tuple(found)


def _windowed(impulse: Samples, centre: float, reach: float, rate_hz: float, at_hz: Samples) -> Samples:
    """Return the rms of the transform of what a window of ±reach frames about a place holds, near each frequency."""
    half = int(reach)
    index = (round(centre) + np.arange(-half, half + 1)) % impulse.size
    edge = max(2, int(_EDGE * half))
    window = np.ones(index.size)
    window[:edge] = 0.5 - 0.5 * np.cos(np.pi * (np.arange(edge) + 0.5) / edge)
    window[-edge:] = window[:edge][::-1]
    size = 1 << (2 * index.size - 1).bit_length()
    lines = np.abs(np.fft.rfft(impulse[index] * window, size)) ** 2
    bin_hz = rate_hz / size
    means = []
    for hz in at_hz.tolist():
        first, last = math.floor(hz / _AVERAGED / bin_hz), math.ceil(hz * _AVERAGED / bin_hz)
        means.append(float(lines[first : min(last, lines.size - 1) + 1].mean()))
    return np.asarray(np.sqrt(np.array(means)), dtype=np.float64)
