"""What an amplifier puts out at rest: noise under three weightings, mains lines, offset and density, in full scales."""

import math

import attrs
import numpy as np

from wattproof.core.quantity import Quantity, measured
from wattproof.core.signal import Samples
from wattproof.dsp.band import NoiseSpectrum, band_noise, noise_spectrum
from wattproof.dsp.fit import block_of, fit_trend
from wattproof.dsp.loop import densities
from wattproof.dsp.mains import Hum, find_hum
from wattproof.dsp.model import Matrix
from wattproof.dsp.quasi_peak import indicated
from wattproof.dsp.weighting import a_weight, itu_weight, itu_weighted, weighted_square

LOWEST_DENSITY_HZ = 10.0
MOST_DENSITY = 0.45  # of the rate


@attrs.frozen
class HumLine:
    """One line of hum: its frequency, and its rms to that of a full-scale sine."""

    frequency_hz: float
    level_fs: Quantity


@attrs.frozen(eq=False)
class Quiet:
    """One channel at rest. Levels are rms to that of a full-scale sine; `dc_fs` is to full scale.

    `noise` is without the mains lines, `unweighted` with them; `quasi_peak` and its highest swing are what the BS.468-4
    meter shows.
    """

    unweighted: Quantity
    noise: Quantity
    hum: Quantity
    a_weighted: Quantity
    quasi_peak: Quantity
    quasi_peak_highest: float
    dc_fs: Quantity
    mains_hz: float | None
    lines: tuple[HumLine, ...]
    density: tuple[tuple[float, float], ...]  # Hz, and rms to a full-scale sine in 1 Hz, lines left out


def read_quiet(samples: Samples, rate_hz: float, band_hz: tuple[float, float]) -> tuple[Quiet, ...]:
    """Return what each channel of samples, shape (frames, channels), holds in a band (edges included).

    The BS.468-4 meter takes all that was captured, since its network ends the band by itself.

    Raises:
        ValueError: shorter than the meter takes to settle.
    """
    block = block_of(samples)
    trend = fit_trend(block, rate_hz)
    left: Matrix = block - trend.waveform()
    spectrum = noise_spectrum(left, rate_hz)
    high_hz = min(band_hz[1], rate_hz / 2.0)
    found = []
    for channel in range(block.shape[0]):
        one = left[channel : channel + 1]
        hum = find_hum(one, spectrum.power[channel], rate_hz, None, (band_hz[0], high_hz))
        rest = one if hum is None or hum.waveform is None else one - hum.waveform
        clean = spectrum if rest is one else noise_spectrum(rest, rate_hz)
        own = channel if clean is spectrum else 0
        offset = measured(float(trend.dc[channel]), _offset_u(clean, own), "1")
        told = _channel(one.ravel(), clean, own, hum, (band_hz[0], high_hz), offset)
        found.append(attrs.evolve(told, density=_density(rest.reshape(-1, 1), rate_hz)))
    return tuple(found)


def _channel(  # noqa: PLR0913, PLR0917 - a channel is made of this many things
    samples: Samples,
    spectrum: NoiseSpectrum,
    row: int,
    hum: Hum | None,
    band_hz: tuple[float, float],
    offset: Quantity,
) -> Quiet:
    low, high = band_hz
    plain = band_noise(spectrum, row, low, high, fitted=4.0)
    bins = np.arange(spectrum.power.shape[1], dtype=np.float64) * spectrum.bin_hz
    a = weighted_square(spectrum, row, a_weight(bins), low, high)
    lines_hz = () if hum is None else tuple(number * hum.frequency_hz for number in hum.numbers)
    squares = () if hum is None else hum.mean_squares
    hum_square = math.fsum(squares)
    noises = () if hum is None else hum.line_noise
    u_hum = math.sqrt(math.fsum(2.0 * square * noise for square, noise in zip(squares, noises, strict=True)))
    a_lines = math.fsum(
        square * float(a_weight(np.array(hz, dtype=np.float64))) ** 2
        for square, hz in zip(squares, lines_hz, strict=True)
    )
    rate_hz = spectrum.bin_hz * spectrum.frames
    meter = indicated(itu_weighted(samples, rate_hz), rate_hz)
    root2 = math.sqrt(2.0)  # an rms over that of a full-scale sine
    return Quiet(
        unweighted=_level(plain.mean_square + hum_square, math.hypot(plain.u, u_hum)),
        noise=_level(plain.mean_square, plain.u),
        hum=_level(hum_square, u_hum),
        a_weighted=_level(a.mean_square + a_lines, math.hypot(a.u, u_hum if a_lines else 0.0)),
        quasi_peak=measured(root2 * meter.mean, root2 * meter.u, "1"),
        quasi_peak_highest=root2 * meter.highest,
        dc_fs=offset,
        mains_hz=None if hum is None else hum.frequency_hz,
        lines=tuple(
            HumLine(hz, _level(square, math.sqrt(2.0 * square * noise)))
            for hz, square, noise in zip(lines_hz, squares, noises, strict=True)
        ),
        density=(),
    )


def _density(samples: Samples, rate_hz: float) -> tuple[tuple[float, float], ...]:
    """Return the noise density of samples, shape (frames, 1), in twelfths of an octave."""
    found = densities(samples, rate_hz, None, LOWEST_DENSITY_HZ, MOST_DENSITY * rate_hz)
    return tuple(zip(found.frequency_hz.tolist(), found.density_fs[0].tolist(), strict=True))


def _offset_u(spectrum: NoiseSpectrum, row: int) -> float:
    """Return the standard uncertainty of a mean: from the noise density of the lowest bins."""
    lowest = spectrum.power[row, 2:12]
    return math.sqrt(float(lowest.mean()) / 2.0)


def _level(square: float, u_square: float) -> Quantity:
    """Return the rms of a mean square to that of a full-scale sine."""
    value = math.sqrt(2.0 * max(square, 0.0))
    return measured(
        value, min(u_square / value, math.sqrt(2.0 * u_square)) if value else math.sqrt(2.0 * u_square), "1"
    )


def white_share(low_hz: float, high_hz: float, weight: str) -> float:
    """Return weighted over unweighted rms of white noise from low to high; weight is "a" or "itu"."""
    at = np.arange(low_hz, high_hz + 0.25, 0.5)
    curve = a_weight(at) if weight == "a" else itu_weight(at)
    return float(np.sqrt(np.mean(curve**2)))
