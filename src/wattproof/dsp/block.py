"""One block analysed: the fit, what it left, and the spectrum of that, for all channels at one frequency."""

import attrs
import numpy as np

from wattproof.core.signal import Samples
from wattproof.dsp.band import NoiseSpectrum, line_noise, noise_spectrum
from wattproof.dsp.fit import SineFit
from wattproof.dsp.mains import Hum
from wattproof.dsp.model import Matrix
from wattproof.dsp.prepared import Phasors
from wattproof.dsp.workspace import Workspace

EDGE = 1e-6  # a harmonic within this share beyond an edge is on it: what rounding and a good clock leave open


def orders_to(frequency_hz: float, high_hz: float, rate_hz: float, seconds: float) -> int:
    """Return the highest order at or below high_hz and clear of half the rate; at least 1, the fundamental."""
    highest_hz = min(high_hz * (1.0 + EDGE), rate_hz / 2.0 - 2.0 / seconds)
    return max(1, int(highest_hz / frequency_hz))


@attrs.frozen(eq=False)
class Block:
    """A block and its analysis.

    `samples` and `left` (residual less harmonics) have shape (channels, rows, columns). `orders` (lines,) counts the
    fundamental and the harmonics; `amplitudes` (channels, lines) are their complex peak amplitudes; `noise` (channels,
    lines) is the mean square that noise alone puts on each.
    """

    samples: Matrix
    rate_hz: float
    fit: SineFit
    left: Matrix
    spectrum: NoiseSpectrum
    orders: Samples
    amplitudes: Phasors
    noise: Matrix
    hum: tuple[Hum | None, ...]


def analysed(
    samples: Matrix,
    fit: SineFit,
    *,
    left: Matrix | None = None,
    hum: Hum | None = None,
    work: Workspace | None = None,
) -> Block:
    """Return the analysis of samples, shape (channels, rows, columns), that `fit` was made of.

    `left` is given where more than the fit was taken out, `hum` where that was a single channel's hum. With `work` the
    result holds until the next one is made there.
    """
    if left is None:
        left = fit.waveform(out=work.array("left", samples.shape) if work else None)
        np.subtract(samples, left, out=left)
    spectrum = noise_spectrum(left, fit.rate_hz, work)
    orders = np.array(fit.model.orders, dtype=np.float64)
    ramp = fit.model.ramp if orders.size else 0
    amplitudes, variance = fit.coefficients[:, ramp:].copy(), fit.prepared.unit_variance[ramp:].copy()
    amplitudes[:, :1], variance[:1] = fit.coefficients[:, :1], fit.prepared.unit_variance[:1]  # not those of the ramp
    spread = variance * (fit.frames / 2.0)  # 1 where columns are orthogonal
    noise = line_noise(spectrum.power, orders * (fit.frequency_hz / spectrum.bin_hz)) * spread
    hums = (hum,) * samples.shape[0]
    return Block(samples, fit.rate_hz, fit, left, spectrum, orders, amplitudes, noise, hums)
