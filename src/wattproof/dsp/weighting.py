"""Weighting curves of noise, exact on the bins of a spectrum: A (IEC 61672-1) and ITU-R BS.468-4.

No filter is run: a curve multiplies the power of each bin, so nothing is warped towards half the rate.
"""

import math
from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.dsp.band import NoiseSpectrum, excess_variance

Phasors = NDArray[np.complex128]


@lru_cache(maxsize=1)
def a_poles_hz() -> tuple[float, float, float, float]:
    """Return f1 (double), f2, f3, f4 (double) of the A curve, in Hz, unrounded.

    They follow from the corner frequencies fL = 10^1.5, fH = 10^3.9, fr = 1000 and fA = 10^2.45 Hz, with half the power
    at fL and fH of the C curve and the A curve's further two poles about fA (IEC 61672-1:2013, annex E, E.2 to E.5).
    """
    low, high, middle, extra = 10.0**1.5, 10.0**3.9, 1000.0, 10.0**2.45
    half = math.sqrt(0.5)
    b = (middle**2 + low**2 * high**2 / middle**2 - half * (low**2 + high**2)) / (1.0 - half)
    c = low**2 * high**2
    spread = math.sqrt(b * b - 4.0 * c)
    f1, f4 = math.sqrt((-b - spread) / 2.0), math.sqrt((-b + spread) / 2.0)
    f2, f3 = extra * (3.0 - math.sqrt(5.0)) / 2.0, extra * (3.0 + math.sqrt(5.0)) / 2.0
    return f1, f2, f3, f4


def a_weight(frequency_hz: Samples) -> Samples:
    """Return the A curve as plain amplitude ratios, exactly 1 at 1 kHz; shape as given (IEC 61672-1:2013, E.6)."""
    f1, f2, f3, f4 = a_poles_hz()

    def raw(square: Samples) -> Samples:
        top = f4**2 * square**2
        return np.asarray(
            top / ((square + f1**2) * np.sqrt(square + f2**2) * np.sqrt(square + f3**2) * (square + f4**2)),
            dtype=np.float64,
        )

    return raw(np.asarray(frequency_hz, dtype=np.float64) ** 2) / raw(np.array(1e6))


# The passive network of Recommendation ITU-R BS.468-4, figure 1a, as polynomials in f (Hz).
_H1 = (-4.737338981378384e-24, 2.043828333606125e-15, -1.363894795463638e-7, 1.0)  # f⁶, f⁴, f², 1
_H2 = (1.306612257412824e-19, -2.118150887518656e-11, 5.559488023498642e-4)  # f⁵, f³, f


def itu_response(frequency_hz: Samples) -> Phasors:
    """Return the complex response of the BS.468-4 network, of magnitude 1 at 1 kHz; shape as given."""

    def raw(f: Samples) -> Phasors:
        square = f * f
        h1 = ((_H1[0] * square + _H1[1]) * square + _H1[2]) * square + _H1[3]
        h2 = f * ((_H2[0] * square + _H2[1]) * square + _H2[2])
        return np.asarray(1j * f / (h1 + 1j * h2), dtype=np.complex128)

    return raw(np.asarray(frequency_hz, dtype=np.float64)) / abs(complex(raw(np.array(1000.0, dtype=np.float64))))


def itu_weight(frequency_hz: Samples) -> Samples:
    """Return the BS.468-4 curve as plain amplitude ratios, exactly 1 at 1 kHz; shape as given."""
    return np.abs(itu_response(frequency_hz))


def itu_weighted(samples: Samples, rate_hz: float) -> Samples:
    """Return samples, shape (frames,), through the BS.468-4 network; what lies before them is taken as silence."""
    size = 1 << (samples.size + 4096 - 1).bit_length()
    spectrum = np.fft.rfft(samples, size)
    spectrum *= itu_response(np.arange(spectrum.size, dtype=np.float64) * (rate_hz / size))
    return np.asarray(np.fft.irfft(spectrum, size)[: samples.size], dtype=np.float64)


@attrs.frozen
class WeightedSquare:
    """A weighted mean square, and its standard uncertainty from the noise's own scatter."""

    mean_square: float
    u: float


def weighted_square(
    spectrum: NoiseSpectrum, channel: int, weight: Samples, low_hz: float, high_hz: float
) -> WeightedSquare:
    """Return the mean square of a noise spectrum from low_hz to high_hz, both included, under a weight.

    `weight` holds amplitude ratios, shape (bins,) of the whole spectrum. A bin of noise scatters by its own mean
    (E[p²] = 2·E[p]²), and the taper widens that by its excess variance.
    """
    inside = spectrum.bins(low_hz, high_hz)
    power = spectrum.power[channel, inside] * weight[inside] ** 2
    variance = float(power @ power) / 2.0 * excess_variance(spectrum.frames)
    return WeightedSquare(float(power.sum()), math.sqrt(variance))
