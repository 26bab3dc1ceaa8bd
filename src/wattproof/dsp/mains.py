"""Hum: lines at multiples of 50 or 60 Hz, told from the tone's own harmonics, found in what the fit left."""

from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.dsp.band import NoiseSpectrum, line_noise
from wattproof.dsp.fit import fit_block
from wattproof.dsp.model import Matrix, Model
from wattproof.dsp.start import hann_spectrum, line_near

NOMINAL_HZ = (50.0, 60.0)
TOLERANCE = 0.005  # public supplies keep within 1 %, mostly 0.2 %: common practice, no source
HIGHEST_LINE = 100  # 5 or 6 kHz: beyond, lines of a rectifier's buzz drown in noise; common practice, no source
APART_BINS = 2.0  # lines nearer than this to a harmonic, in units of 1/T, cannot be told from it
_CLEAR = 30.0  # a line that shows the mains frequency stands this far (15 dB) over the noise in its bandwidth
_QUICK_NUMBERS = 8
_FAINTEST = 1e-9  # −180 dBFS: below, a line is the rounding of numbers and not of this world
_SEEN = 12.0  # and any other line this far over the noise on one line: chance e^−12


@attrs.frozen(eq=False)
class Hum:
    """The mains frequency, and mean squares of its lines; `line_noise` is what noise alone puts on one line."""

    frequency_hz: float
    numbers: tuple[int, ...]
    mean_squares: tuple[float, ...]
    line_noise: tuple[float, ...]
    waveform: Matrix | None = None  # (1, rows, columns)


def _apart(number: int, mains_hz: float, tone_hz: float | None, seconds: float) -> bool:
    if tone_hz is None:
        return True
    order = max(1, round(number * mains_hz / tone_hz))
    return bool(abs(order * tone_hz - number * mains_hz) * seconds >= APART_BINS)


def contains_mains(frequency_hz: float, mains_hz: float | None, seconds: float) -> bool:
    """Tell whether a line at frequency_hz may hold a line of hum too; without a known mains both nominals count."""
    for candidate in (mains_hz,) if mains_hz else NOMINAL_HZ:
        number = round(frequency_hz / candidate)
        if 1 <= number <= HIGHEST_LINE and abs(frequency_hz - number * candidate) * seconds < APART_BINS:
            return True
    return False


def _candidate(residual: Samples, rate_hz: float, tone_hz: float | None, high_hz: float) -> tuple[float, int] | None:
    """Return the mains frequency and the number of its clearest line, or None where no line is clear."""
    seconds = residual.size / rate_hz
    spectrum = hann_spectrum(residual, rate_hz, 20.0, min(high_hz, 2500.0))
    best: tuple[float, float, int] | None = None
    for nominal in NOMINAL_HZ:
        reach = max(TOLERANCE, 1.0 / (seconds * nominal))
        for number in range(1, 7):
            centre = nominal * number
            if centre > high_hz or number == 6 == round(centre / 50.0) or not _apart(number, nominal, tone_hz, seconds):
                continue
            line = line_near(spectrum, centre * (1.0 - reach), centre * (1.0 + reach))
            clear = line.over_noise > _CLEAR and line.amplitude > _FAINTEST
            if clear and (best is None or line.amplitude > best[0]):
                best = line.amplitude, line.frequency_hz / number, number
    return None if best is None else (best[1], best[2])


def find_hum(
    residual: Matrix, power: Samples, rate_hz: float, tone_hz: float | None, band_hz: tuple[float, float]
) -> Hum | None:
    """Find hum in a residual, shape (1, rows, columns), whose mean squares per bin are `power`; None if there is none.

    A block shorter than 0.2 s tells no hum from noise.
    """
    seconds = residual.size / rate_hz
    if seconds < 0.2:
        return None
    found = _candidate(residual.ravel(), rate_hz, tone_hz, band_hz[1])
    if found is None:
        return None
    mains_hz, clearest = found
    numbers = [
        number
        for number in range(1, HIGHEST_LINE + 1)
        if band_hz[0] * (1 - 1e-3) <= number * mains_hz <= min(band_hz[1], 0.45 * rate_hz)
        and _apart(number, mains_hz, tone_hz, seconds)
    ]
    if clearest not in numbers:
        return None
    fit = fit_block(residual, rate_hz, mains_hz, Model((clearest, *(n for n in numbers if n != clearest)), 1, 1))
    heights = np.abs(fit.coefficients[0]) ** 2 / 2.0
    by_number = {clearest: float(heights[0])}
    by_number |= dict(zip(fit.model.orders[1:], (float(height) for height in heights[2:]), strict=True))
    places = np.array(numbers, dtype=np.float64) * fit.frequency_hz * seconds
    noise = dict(zip(numbers, line_noise(power, places).tolist(), strict=True))
    seen = tuple(number for number in numbers if by_number[number] > _SEEN * noise[number])
    solution = fit.solution.copy()
    terms = solution.view(np.complex128)[:, 1:]
    terms[:, [i for i, (_, number) in enumerate(fit.model.terms) if number not in seen]] = 0.0
    solution[:, :2] = 0.0
    return Hum(
        frequency_hz=fit.frequency_hz,
        numbers=seen,
        mean_squares=tuple(by_number[number] for number in seen),
        line_noise=tuple(noise[number] for number in seen),
        waveform=fit.prepared.waveform(solution),
    )


@lru_cache(maxsize=32)
def _quick_places(bins: int, seconds: float, low_hz: float) -> tuple[NDArray[np.intp], Matrix]:
    """Return multiples 1…8 of both nominals, and their bins; multiples below the band lie at bin 0."""
    numbers = np.tile(np.arange(1, _QUICK_NUMBERS + 1), len(NOMINAL_HZ))
    frequencies = numbers * np.repeat(NOMINAL_HZ, _QUICK_NUMBERS)
    places = np.where(frequencies >= low_hz, frequencies * seconds, 0.0)
    return numbers, np.where(places < bins - 2, places, 0.0)


def quick_hum(spectrum: NoiseSpectrum, tone_hz: float | None, low_hz: float) -> tuple[Hum | None, ...]:
    """Find hum by the bins around multiples of 50 and 60 Hz: for the live reading, where a fit would cost too much.

    Returns one Hum or None per channel. The frequency is nominal and every line is what its three bins hold over the
    noise. Blocks under 0.2 s tell none.
    """
    power, seconds = spectrum.power, spectrum.seconds
    nothing: tuple[Hum | None, ...] = (None,) * power.shape[0]
    if seconds < 0.2:
        return nothing
    numbers, places = _quick_places(power.shape[1], seconds, low_hz)
    centre = np.rint(places).astype(np.intp)
    noise = line_noise(power, places)
    squares = power[:, centre - 1] + power[:, centre] + power[:, centre + 1] - 2.0 * noise
    clear = (squares > np.maximum(_CLEAR * noise, _FAINTEST**2)) & (centre > 1)
    if tone_hz is not None:
        frequencies = numbers * np.repeat(NOMINAL_HZ, _QUICK_NUMBERS)
        order = np.maximum(1.0, np.rint(frequencies / tone_hz))
        clear &= np.abs(order * tone_hz - frequencies) * seconds >= APART_BINS
    if not clear.any():
        return nothing
    return tuple(_quick_channel(numbers, *rows) for rows in zip(clear, squares, noise, strict=True))


def _quick_channel(numbers: NDArray[np.intp], clear: NDArray[np.bool_], squares: Samples, noise: Samples) -> Hum | None:
    by_nominal = (clear * squares).reshape(len(NOMINAL_HZ), -1).sum(axis=1)
    if not clear.any():
        return None
    which = int(np.argmax(by_nominal))
    part = slice(which * _QUICK_NUMBERS, (which + 1) * _QUICK_NUMBERS)
    seen = np.flatnonzero(clear[part])
    return Hum(
        frequency_hz=NOMINAL_HZ[which],
        numbers=tuple(int(number) for number in numbers[part][seen]),
        mean_squares=tuple(squares[part][seen].tolist()),
        line_noise=tuple(noise[part][seen].tolist()),
    )
