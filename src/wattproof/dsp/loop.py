"""Figures of a loop that need no whole reading: a tone's phasor in every channel, noise densities, sample format."""

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.dsp.band import line_noise, noise_spectrum
from wattproof.dsp.fit import block_of, fit_block, fit_trend
from wattproof.dsp.model import Matrix, Model
from wattproof.dsp.sweep import points

BITS = (16, 20, 24)  # word lengths of converters that are met


@attrs.frozen(eq=False)
class Tones:
    """One tone in every channel: its frequency, complex peak amplitudes (channels,), and the u of their real parts."""

    frequency_hz: float
    amplitudes: NDArray[np.complex128]
    u: Samples


def tones(samples: Samples, rate_hz: float, near_hz: float) -> Tones:
    """Return the tone near a frequency in samples, shape (frames, channels); its phase is at the block's centre.

    The frequency is that of all channels together, so that a channel that holds next to nothing is read at the
    frequency of one that holds the tone.
    """
    block = block_of(samples)
    fit = fit_block(block, rate_hz, near_hz, Model((1,), 1, 3))
    left: Matrix = block - fit.waveform()
    noise = noise_spectrum(left, rate_hz)
    place = np.array([fit.frequency_hz / noise.bin_hz])
    return Tones(fit.frequency_hz, fit.coefficients[:, 0], np.sqrt(line_noise(noise.power, place)[:, 0]))


@attrs.frozen(eq=False)
class Densities:
    """Noise density of every channel: `density_fs` (channels, frequencies), rms to a full-scale sine in 1 Hz."""

    frequency_hz: Samples
    density_fs: Matrix


def densities(samples: Samples, rate_hz: float, near_hz: float | None, low_hz: float, high_hz: float) -> Densities:
    """Return noise densities in twelfths of an octave, the tone near `near_hz` (None: none) and its orders left out.

    Each is the median of its bins, turned into a mean, so that single lines do not count.
    """
    block = block_of(samples)
    if near_hz is None:
        fit = fit_trend(block, rate_hz)
    else:
        orders = tuple(range(1, max(1, int(0.45 * rate_hz / near_hz)) + 1))
        fit = fit_block(block, rate_hz, near_hz, Model(orders, 1, 3))
    spectrum = noise_spectrum(block - fit.waveform(), rate_hz)
    least_hz = 4.0 * spectrum.bin_hz
    frequencies = points(max(low_hz, least_hz), high_hz)
    step = (frequencies[1] / frequencies[0]) ** 0.5
    columns = []
    for frequency_hz in frequencies.tolist():
        reach_hz = max(frequency_hz * (step - 1.0), 2.0 * spectrum.bin_hz)
        power = spectrum.power[:, spectrum.bins(frequency_hz - reach_hz, frequency_hz + reach_hz)]
        columns.append(np.median(power, axis=1) / np.log(2.0))
    # a mean square of x is 2x to a full-scale sine's own, which is one half
    return Densities(frequencies, np.sqrt(2.0 * np.array(columns).T / spectrum.bin_hz))


def sample_format(samples: Samples) -> str:
    """Return the word length that samples, in full-scale units, show: "16 bit", "20 bit", "24 bit", or "float"."""
    for bits in BITS:
        codes = samples * 2.0 ** (bits - 1)
        if np.array_equal(codes, np.rint(codes)):
            return f"{bits} bit"
    return "float"
