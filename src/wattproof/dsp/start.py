"""Where a fit starts: the strongest line of a Hann-windowed spectrum, and how far it stands above the noise."""

from functools import lru_cache

import attrs
import numpy as np

from wattproof.core.signal import Samples

_HANN_NOISE_BINS = 1.5  # noise bandwidth of the Hann window, in bins (closed form)
MEDIAN_OF_NOISE = np.log(2.0)  # median over mean of the power of a noise bin (exponential distribution, closed form)


_BESIDE = np.array([offset for offset in range(-40, 41) if abs(offset) > 7])  # clear of a line's skirt
AUDIBLE_HZ = 20_000.0


def highest_tone_hz(high_hz: float, rate_hz: float) -> float:
    """Return up to where a tone is looked for unasked: the band's end or 20 kHz, so that no carrier passes for one."""
    return min(max(high_hz, AUDIBLE_HZ), 0.49 * rate_hz)


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

    def holds(self, low_hz: float, high_hz: float) -> bool:
        """Tell whether a bin lies from low_hz to high_hz, those of DC and half the rate left out."""
        return max(1, int(np.ceil(low_hz / self.bin_hz))) <= min(self.power.size - 2, int(high_hz / self.bin_hz))

    def noise_beside(self, peak: int) -> float:
        """Return the mean power of a noise bin beside a line, from the median of bins around it."""
        bins = peak + _BESIDE
        bins = bins[(bins >= 1) & (bins <= self.power.size - 2)]
        return float(np.median(self.power[bins]) / MEDIAN_OF_NOISE) if bins.size else 0.0


def hann_spectrum(samples: Samples, rate_hz: float) -> Spectrum:
    """Return the Hann spectrum of samples, shape (frames,)."""
    frames = samples.size
    centred = samples - samples.mean()
    centred *= hann(frames)
    squares = np.fft.rfft(centred).view(np.float64)
    squares *= squares
    power = squares[0::2] + squares[1::2]
    power *= (4.0 / frames) ** 2
    return Spectrum(power, rate_hz / frames)


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
    if not spectrum.holds(low_hz, high_hz):
        raise ValueError(f"no line fits between {low_hz:g} and {high_hz:g} Hz; the block is too short")
    peak = first + int(np.argmax(power[first : last + 1]))
    side = 1 if power[peak + 1] >= power[peak - 1] else -1
    largest, beside = float(power[peak]), float(power[peak + side])
    if largest == 0.0:
        return Line(peak * bin_hz, 0.0, 0.0)
    ratio = (beside / largest) ** 0.5
    offset = min(1.0, max(0.0, (2.0 * ratio - 1.0) / (ratio + 1.0)))
    shape = np.sinc(offset) / (1.0 - offset * offset) if offset < 1.0 else 0.5
    over = largest / max(spectrum.noise_beside(peak), float(np.finfo(float).tiny))
    return Line((peak + side * offset) * bin_hz, float(largest**0.5 / shape), over)
