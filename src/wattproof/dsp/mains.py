"""Hum: lines at multiples of 50 or 60 Hz, told from the tone's own harmonics, found in what the fit left."""

from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.dsp.band import NoiseSpectrum, line_noise
from wattproof.dsp.fit import fit_block
from wattproof.dsp.model import Matrix, Model
from wattproof.dsp.start import Line, Spectrum, hann_spectrum, line_near

NOMINAL_HZ = (50.0, 60.0)
TOLERANCE = 0.005  # public supplies keep within 1 %, mostly 0.2 %: common practice, no source
HIGHEST_LINE = 100  # 5 or 6 kHz: beyond, lines of a rectifier's buzz drown in noise; common practice, no source
APART_BINS = 2.0  # lines nearer than this to a harmonic, in units of 1/T, cannot be told from it
_CLEAR = 30.0  # a line that shows the mains frequency stands this far (15 dB) over the noise in its bandwidth
_QUICK_NUMBERS = 8
_QUICK_BINS = 4  # the tapered block keeps 99 % of a line within four bins, wherever between them it lies
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
    spectrum = hann_spectrum(residual, rate_hz)
    by_nominal = [_clear_lines(spectrum, nominal, seconds, tone_hz, high_hz) for nominal in NOMINAL_HZ]
    # 300 Hz belongs to both: the nominal of which more is seen has it
    lines = max(by_nominal, key=lambda clear: sum(line.amplitude**2 for line in clear.values()))
    if not lines:
        return None
    clearest = max(lines, key=lambda number: lines[number].amplitude)
    return lines[clearest].frequency_hz / clearest, clearest


def _clear_lines(
    spectrum: Spectrum, nominal: float, seconds: float, tone_hz: float | None, high_hz: float
) -> dict[int, Line]:
    """Return the clear lines among the first six multiples of one nominal, by number."""
    reach = max(TOLERANCE, 1.0 / (seconds * nominal))
    found = {}
    for number in range(1, 7):
        centre = nominal * number
        if centre > high_hz or not _apart(number, nominal, tone_hz, seconds):
            continue
        line = line_near(spectrum, centre * (1.0 - reach), centre * (1.0 + reach))
        if line.over_noise > _CLEAR and line.amplitude > _FAINTEST:
            found[number] = line
    return found


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
def _quick_places(bins: int, seconds: float, low_hz: float, high_hz: float) -> tuple[NDArray[np.intp], Matrix]:
    """Return multiples 1…8 of both nominals, and their bins; multiples outside the band lie at bin 0."""
    numbers = np.tile(np.arange(1, _QUICK_NUMBERS + 1), len(NOMINAL_HZ))
    frequencies = numbers * np.repeat(NOMINAL_HZ, _QUICK_NUMBERS)
    inside = (frequencies >= low_hz) & (frequencies <= high_hz)
    places = np.where(inside, frequencies * seconds, 0.0)
    return numbers, np.where(places < bins - _QUICK_BINS - 1, places, 0.0)


def quick_hum(
    spectrum: NoiseSpectrum, tone_hz: float | None, band_hz: tuple[float, float]
) -> tuple[tuple[Hum | None, ...], NoiseSpectrum]:
    """Find hum by the bins around multiples of 50 and 60 Hz: for the live reading, where a fit would cost too much.

    Returns one Hum or None per channel, and the spectrum with noise in the place of these lines. The frequency is
    nominal, and every line is what four bins to each side hold over the noise. Blocks under 0.2 s tell none.
    """
    power, seconds = spectrum.power, spectrum.seconds
    nothing: tuple[Hum | None, ...] = (None,) * power.shape[0]
    if seconds < 0.2:
        return nothing, spectrum
    numbers, places = _quick_places(power.shape[1], seconds, *band_hz)
    centre = np.rint(places).astype(np.intp)
    noise = line_noise(power, places)
    squares = power[:, centre - 1] + power[:, centre] + power[:, centre + 1] - 2.0 * noise
    clear = (squares > np.maximum(_CLEAR * noise, _FAINTEST**2)) & (centre > 1)
    if tone_hz is not None:
        frequencies = numbers * np.repeat(NOMINAL_HZ, _QUICK_NUMBERS)
        order = np.maximum(1.0, np.rint(frequencies / tone_hz))
        clear &= np.abs(order * tone_hz - frequencies) * seconds >= APART_BINS
    if not clear.any():
        return nothing, spectrum
    cleaned = power.copy()
    strength = (clear * squares).reshape(power.shape[0], len(NOMINAL_HZ), -1).sum(axis=2)
    hums = tuple(
        _moved_out(cleaned[channel], int(np.argmax(strength[channel])), clear[channel], centre, noise[channel])
        for channel in range(power.shape[0])
    )
    return hums, NoiseSpectrum(cleaned, spectrum.bin_hz, spectrum.frames)


def _moved_out(
    power: Samples, nominal: int, clear: NDArray[np.bool_], centre: NDArray[np.intp], noise: Samples
) -> Hum | None:
    """Replace the clear lines of one nominal in power, shape (bins,), by noise; return them as hum."""
    seen = nominal * _QUICK_NUMBERS + np.flatnonzero(clear.reshape(len(NOMINAL_HZ), -1)[nominal])
    if not seen.size:
        return None
    squares = []
    for line in seen.tolist():
        bins = slice(max(1, int(centre[line]) - _QUICK_BINS), int(centre[line]) + _QUICK_BINS + 1)
        held = power[bins]
        squares.append(float(held.sum() - (held.size - 1) * noise[line]))
        held[:] = noise[line]
    return Hum(
        frequency_hz=NOMINAL_HZ[nominal],
        numbers=tuple((seen % _QUICK_NUMBERS + 1).tolist()),
        mean_squares=tuple(squares),
        line_noise=tuple(noise[seen].tolist()),
    )
