"""Noise in a band: the spectrum of what a fit left, through an ideal filter, with the fit's freedom given back.

The block is tapered by a cosine over an eighth of its length at each end: far lines and drift then do not leak into the
band, while the variance of a noise power grows by 15 % only (a Hann window would double it).
"""

import math
from functools import lru_cache

import attrs
import numpy as np

from wattproof.core.signal import Samples
from wattproof.dsp.model import Matrix
from wattproof.dsp.start import MEDIAN_OF_NOISE
from wattproof.dsp.workspace import Workspace

TAPERED = 0.25  # share of the block that is tapered, both ends together
_AROUND = np.array([offset for offset in range(-22, 23) if abs(offset) > 2])  # bins that tell of a line's noise
_LOWEST = 3
WINDOW = "cosine-tapered, an eighth at each end"


@lru_cache(maxsize=16)
def taper(frames: int) -> Samples:
    """Return the taper, shape (frames,), scaled so that the mean of its square is 1."""
    edge = max(1, round(frames * TAPERED / 2.0))
    rise = 0.5 - 0.5 * np.cos(np.pi * (np.arange(edge) + 0.5) / edge)
    window = np.ones(frames)
    window[:edge], window[frames - edge :] = rise, rise[::-1]
    scaled: Samples = window / np.sqrt(np.mean(window**2))
    return scaled


@lru_cache(maxsize=16)
def noise_bandwidth_bins(frames: int) -> float:
    """Effective noise bandwidth of the taper in bins: N·Σw²/(Σw)²."""
    window = taper(frames)
    return float(window.size * np.sum(window**2) / np.sum(window) ** 2)


@lru_cache(maxsize=16)
def excess_variance(frames: int) -> float:
    """How much the taper widens the variance of a noise power: N·Σw⁴/(Σw²)²."""
    window = taper(frames)
    return float(window.size * np.sum(window**4) / np.sum(window**2) ** 2)


@attrs.frozen(eq=False)
class NoiseSpectrum:
    """Mean-square per bin, `power` of shape (channels, bins); sums over bins are mean squares of the block."""

    power: Matrix
    bin_hz: float
    frames: int

    @property
    def seconds(self) -> float:
        """How long the block was."""
        return 1.0 / self.bin_hz

    def bins(self, low_hz: float, high_hz: float) -> slice:
        """Return the bins whose centres lie from low_hz to high_hz, both included; never the one of DC."""
        first = max(1, math.ceil(low_hz / self.bin_hz - 1e-9))
        last = min(self.power.shape[1] - 1, math.floor(high_hz / self.bin_hz + 1e-9))
        return slice(first, max(first, last + 1))


def noise_spectrum(residual: Matrix, rate_hz: float, work: Workspace | None = None) -> NoiseSpectrum:
    """Return the tapered spectrum of a residual, shape (channels, rows, columns); its power lies in `work` if given."""
    work = work or Workspace()
    flat = residual.reshape(residual.shape[0], -1)
    frames = flat.shape[1]
    window = taper(frames)
    power = work.array("power", (flat.shape[0], frames // 2 + 1))
    tapered = work.array("tapered", (frames,))
    for channel in range(flat.shape[0]):  # one channel at a time stays in the processor's cache
        np.multiply(flat[channel], window, out=tapered)
        squares = np.fft.rfft(tapered).view(np.float64)
        np.multiply(squares, squares, out=squares)
        np.add(squares[0::2], squares[1::2], out=power[channel])
    power *= 2.0 / frames**2
    power[:, 0] *= 0.5
    if frames % 2 == 0:
        power[:, -1] *= 0.5
    return NoiseSpectrum(power, rate_hz / frames, frames)


def line_noise(power: Matrix, places: Samples) -> Samples:
    """Return the mean square that noise alone puts on a line at each place (in bins), from the bins around it.

    `power` has shape (…, bins); the result (…, places) is the median of 40 bins, turned into a mean.
    """
    last = power.shape[-1] - 1
    bins = np.rint(places).astype(np.intp)[:, None] + _AROUND
    # at either end the other side stands in, mirrored; the lowest bins are what the trend took
    bins = np.abs(last - np.abs(last - _LOWEST - np.abs(bins - _LOWEST)))
    middle = _AROUND.size // 2
    ranked = np.partition(power[..., bins], (middle - 1, middle), axis=-1)
    noise: Samples = (ranked[..., middle - 1] + ranked[..., middle]) * (0.5 / MEDIAN_OF_NOISE)
    return noise


@attrs.frozen
class BandNoise:
    """Noise of one channel in a band: its mean square, freedom given back, and the standard uncertainty of that."""

    mean_square: float
    u: float


def band_noise(  # noqa: PLR0913 - a band, what the fit took from it and what stands in it
    spectrum: NoiseSpectrum,
    channel: int,
    low_hz: float,
    high_hz: float,
    *,
    fitted: float,
    lines_hz: tuple[float, ...] = (),
) -> BandNoise:
    """Return the noise from low_hz to high_hz, both included.

    `fitted` is how many real numbers the fit took from within the band; a band of width B over T holds 2·B·T of them,
    so what is left is scaled by 2BT/(2BT − fitted). Bins at the edges count by their share of the band. The scatter is
    that of the effective bandwidth (Σp)²/Σp², which equals B for white noise, times the taper's excess variance;
    `lines_hz` are steady lines, which count in the noise but do not scatter like it.
    """
    inside = spectrum.bins(low_hz, high_hz)
    power = spectrum.power[channel, inside]
    width_hz = high_hz - low_hz
    count = power.size
    if count == 0:
        return BandNoise(0.0, 0.0)
    lines = 0.0
    if lines_hz:
        bins = np.rint(np.array(lines_hz) / spectrum.bin_hz).astype(np.intp)[:, None] + np.arange(-3, 4) - inside.start
        bins = np.unique(bins[(bins >= 0) & (bins < count)])
        lines, power = float(power[bins].sum()), np.delete(power, bins)
    total = float(np.add.reduce(power))
    square = float(power @ power)
    # bins at the edges count by their share, and bins taken for a line are filled with what stands beside them
    total *= min(max(width_hz / (count * spectrum.bin_hz), 1.0 - 1.0 / count), 1.0 + 1.0 / count)
    degrees = 2.0 * width_hz * spectrum.seconds
    given_back: float = degrees / max(degrees - fitted, 0.5 * degrees)
    # a bin's own power scatters: E[p²] = 2·E[p]² for noise, hence the factor 2 of the effective bandwidth
    bins_alike = min(2.0 * total * total / square, power.size) if square else power.size
    freedom = max(2.0 * bins_alike / excess_variance(spectrum.frames) - fitted, 1.0)
    noise = total * given_back
    per_line = noise / max(width_hz * spectrum.seconds, 1.0)
    return BandNoise(noise + lines, math.hypot(noise * math.sqrt(2.0 / freedom), 2.0 * math.sqrt(lines * per_line)))
