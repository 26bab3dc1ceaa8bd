"""What a block's spectrum tells beside the reading: a carrier above the band, a second tone inside it."""

import numpy as np

from wattproof.core.notes import Kind, Note, note
from wattproof.core.signal import Samples
from wattproof.core.units import db
from wattproof.dsp.band import line_noise
from wattproof.dsp.block import Block
from wattproof.dsp.start import Line, hann_spectrum, line_near

ABOVE_HZ = 20_000.0
CARRIER_RATIO = 0.01  # −40 dB of the fundamental
_WIDE = 8  # bins to each side of a harmonic that belong to it: beyond, the taper leaves −45 dB of it
_CLEAR = 10.0**1.5  # a second tone stands 15 dB over the noise in its own bandwidth
_HANN_NOISE_BINS = 1.5
_BESIDE_BINS = 5  # bins, and Hz, to each side of a harmonic where a moving level leaves something of it
_BESIDE_HZ = 2.0
_MOST_LINES = 5
_SHARE = 0.1  # and makes up this much of the noise power
_FAINTEST = 1e-8  # −160 dB of the fundamental: below, a line is the rounding of numbers


def carrier_note(block: Block, channel: int) -> Note | None:
    """Return a note where content above 20 kHz that is no harmonic exceeds −40 dB of the fundamental, else None."""
    spectrum, fit = block.spectrum, block.fit
    power = spectrum.power[channel]
    first = int(ABOVE_HZ / spectrum.bin_hz) + _WIDE
    if first >= power.size:
        return None
    fundamental = float(abs(fit.coefficients[channel, 0]) ** 2) / 2.0
    limit = CARRIER_RATIO**2 * fundamental
    if not fundamental or float(np.add.reduce(power[first:])) <= limit:
        return None
    above = power[first:].copy()
    orders = np.arange(int(ABOVE_HZ / fit.frequency_hz), int(block.rate_hz / 2.0 / fit.frequency_hz) + 1)
    places = np.rint(orders * fit.frequency_hz / spectrum.bin_hz).astype(np.intp) - first
    if fit.frequency_hz > 4 * _WIDE * spectrum.bin_hz:
        bins = (places[:, None] + np.arange(-_WIDE, _WIDE + 1)).ravel()
        above[bins[(bins >= 0) & (bins < above.size)]] = 0.0
    content = float(above.sum())
    return note(Kind.CARRIER, db=db((content / fundamental) ** 0.5)) if content > limit else None


def lines_beside(block: Block, channel: int, low_hz: float, high_hz: float) -> tuple[Line, ...]:
    """Return the clearest lines in the band that are neither harmonic nor hum, strongest first, five at the most."""
    high_hz = min(high_hz, 0.49 * block.rate_hz)
    spectrum = hann_spectrum(block.left[channel].ravel(), block.rate_hz)
    if not spectrum.holds(low_hz, high_hz):
        return ()
    first = float(abs(block.fit.coefficients[channel, 0]))
    power = spectrum.power
    orders = np.array((0, *block.fit.model.orders), dtype=np.float64)
    wide = max(_BESIDE_BINS, round(_BESIDE_HZ / spectrum.bin_hz))
    _blank(power, orders * block.fit.frequency_hz / spectrum.bin_hz, wide)
    hum = block.hum[channel]
    if hum is not None:
        _blank(power, np.array(hum.numbers, dtype=np.float64) * hum.frequency_hz / spectrum.bin_hz, 3)
    found: list[Line] = []
    while len(found) < _MOST_LINES:
        line = line_near(spectrum, low_hz, high_hz)
        local = line_noise(block.spectrum.power[channel], np.array([line.frequency_hz / block.spectrum.bin_hz]))[0]
        if line.amplitude**2 / 2.0 < _CLEAR * _HANN_NOISE_BINS * local or line.amplitude <= _FAINTEST * first:
            break
        found.append(line)
        _blank(power, np.array([line.frequency_hz / spectrum.bin_hz]), wide)
    return tuple(found)


def _blank(power: Samples, places: Samples, wide: int) -> None:
    bins = (np.rint(places).astype(np.intp)[:, None] + np.arange(-wide, wide + 1)).ravel()
    power[bins[(bins >= 0) & (bins < power.size)]] = 0.0


def second_tone_note(block: Block, channel: int, lines: tuple[Line, ...], band_hz: tuple[float, float]) -> Note | None:
    """Return a note that names the strongest line where it makes up a tenth of the noise in the band, else None."""
    first = float(abs(block.fit.coefficients[channel, 0]))
    if not lines or not first:
        return None
    noise = float(block.spectrum.power[channel, block.spectrum.bins(*band_hz)].sum())
    if lines[0].amplitude ** 2 / 2.0 < _SHARE * noise:
        return None
    return note(Kind.SECOND_TONE, frequency_hz=lines[0].frequency_hz, db=db(lines[0].amplitude / first))
