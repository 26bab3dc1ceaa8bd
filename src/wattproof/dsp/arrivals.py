"""When a sweep comes back, and whether it comes a second time."""

import math

import attrs
import numpy as np

from wattproof.core.signal import Samples

FROM_HZ, TO_RATE = 300.0, 0.35  # far from couplings, and from the filters near half the rate
LATER_S = 0.003  # later than this no filter of a converter rings any more: common practice, no source
OVER_NOISE = 6.0  # over the median; the highest of 10⁵ noise values is 4 times it (Rayleigh distribution, closed form)


@attrs.frozen
class Arrivals:
    """The frame of the first arrival, and what comes LATER_S or more after it, as a share of it; 0 where only noise."""

    first_frame: int
    second: float = 0.0
    second_after_s: float = 0.0


def arrivals(captured: Samples, played: Samples, rate_hz: float) -> Arrivals:
    """Return the arrivals of `played` in `captured`, both shape (frames,), whose first frames are the same moment.

    By the spectra's quotient over a band whose window is a Hann's, so that the envelope's skirts fall fast.

    Raises:
        ValueError: the capture is shorter than what was played.
    """
    if captured.size < played.size:
        raise ValueError(f"{captured.size} frames of answer to {played.size}: capture all of the sweep and a tail")
    size = 1 << (captured.size + played.size - 1).bit_length()
    sent, came = np.fft.rfft(played, size), np.fft.rfft(captured, size)
    bins = np.arange(math.ceil(FROM_HZ / rate_hz * size), math.floor(TO_RATE * size))
    band = np.zeros(size, dtype=np.complex128)
    band[bins] = came[bins] / sent[bins] * np.hanning(bins.size)
    envelope = np.abs(np.fft.ifft(band))[: captured.size]
    first = int(np.argmax(envelope))
    later = envelope[first + math.ceil(LATER_S * rate_hz) : captured.size - played.size + first]
    if not later.size:
        return Arrivals(first)
    top = int(np.argmax(later))
    if later[top] <= OVER_NOISE * float(np.median(later)) + 1e-9 * envelope[first]:
        return Arrivals(first)
    return Arrivals(first, float(later[top] / envelope[first]), LATER_S + top / rate_hz)
