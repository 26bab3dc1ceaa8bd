"""Where a fit starts: the strongest line of a Hann-windowed spectrum, and how far it stands above the noise."""

from functools import lru_cache

import attrs
import numpy as np

from wattproof.core.signal import Samples

_HANN_NOISE_BINS = 1.5  # noise bandwidth of the Hann window, in bins (closed form)
MEDIAN_OF_NOISE = np.log(2.0)  # median over mean of the power of a noise bin (exponential distribution, closed form)


@lru_cache(maxsize=16)
def hann(frames: int) -> Samples:
    """Return the periodic Hann window, shape (frames,)."""
    return 0.5 - 0.5 * np.cos(2.0 * np.pi * np.arange(frames) / frames)


@attrs.frozen
class Line:
    """A line of a spectrum: where it is, its peak amplitude, and its power over the noise in its own bandwidth."""

    frequency_hz: float
    amplitude: float
    over_noise: float


@attrs.frozen(eq=False)
class Spectrum:
    """Power of a Hann-windowed block: `power[k]` is the squared peak amplitude of a sine that falls on bin k."""

    power: Samples
    bin_hz: float
    noise_power: float  # the mean power of a noise bin, from the median over the range that was asked for


def hann_spectrum(samples: Samples, rate_hz: float, low_hz: float, high_hz: float) -> Spectrum:
    """Return the Hann spectrum of samples, shape (frames,), its noise taken from low_hz to high_hz."""
    frames = samples.size
    lines = np.fft.rfft((samples - samples.mean()) * hann(frames))
    power = (lines.real**2 + lines.imag**2) * (4.0 / frames) ** 2
    bin_hz = rate_hz / frames
    inside = power[max(1, int(low_hz / bin_hz)) : int(high_hz / bin_hz) + 1]
    noise = float(np.median(inside)) / MEDIAN_OF_NOISE if inside.size else 0.0
    return Spectrum(power, bin_hz, noise)


def line_near(spectrum: Spectrum, low_hz: float, high_hz: float) -> Line:
    """Return the strongest line from low_hz to high_hz, its place interpolated between bins.

    Between the two largest bins of a Hann-windowed sine the ratio of amplitudes r gives the place (2r − 1)/(r + 1) of a
    bin beyond the larger one (closed form of the window's transform).

    Raises:
        ValueError: the range holds no bin.
    """
    power, bin_hz = spectrum.power, spectrum.bin_hz
    first = max(1, int(np.ceil(low_hz / bin_hz)))
    last = min(power.size - 2, int(high_hz / bin_hz))
    if last < first:
        raise ValueError(f"no line fits between {low_hz:g} and {high_hz:g} Hz; the block is too short")
    peak = first + int(np.argmax(power[first : last + 1]))
    side = 1 if power[peak + 1] >= power[peak - 1] else -1
    largest, beside = float(power[peak]), float(power[peak + side])
    if largest == 0.0:
        return Line(peak * bin_hz, 0.0, 0.0)
    ratio = (beside / largest) ** 0.5
    offset = min(1.0, max(0.0, (2.0 * ratio - 1.0) / (ratio + 1.0)))
    shape = np.sinc(offset) / (1.0 - offset * offset) if offset < 1.0 else 0.5
    over = largest / (spectrum.noise_power or np.finfo(float).tiny)
    return Line((peak + side * offset) * bin_hz, float(largest**0.5 / shape), over)
