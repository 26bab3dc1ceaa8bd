"""What the screen draws of a block: two periods of the residual, locked to the tone, and the noise by column."""

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from wattproof.core.picture import Picture
from wattproof.core.reading import Reading
from wattproof.core.signal import Samples
from wattproof.dsp.band import WINDOW, noise_bandwidth_bins
from wattproof.dsp.block import Block

PERIODS = 2.0
MOST_POINTS = 1200
COLUMNS = 700


@lru_cache(maxsize=32)
def _columns(bins: int, bin_hz: float, low_hz: float, high_hz: float) -> tuple[NDArray[np.intp], Samples]:
    """Return the first bin of each column of a logarithmic axis, each column with one bin at least, and its place."""
    first = max(1, int(np.ceil(low_hz / bin_hz)))
    last = min(bins - 1, int(high_hz / bin_hz))
    edges = np.geomspace(max(low_hz, bin_hz), max(high_hz, 2.0 * bin_hz), COLUMNS)
    starts = np.unique(np.clip(np.ceil(edges / bin_hz).astype(np.intp), first, max(first, last)))
    ends = np.append(starts[1:], max(last + 1, int(starts[-1]) + 1))
    return starts, (starts + ends - 1) / 2.0 * bin_hz


def spectrum_columns(block: Block, channel: int, low_hz: float, high_hz: float) -> tuple[Samples, Samples]:
    """Return frequency (Hz) and mean square per noise bandwidth of each column, the largest bin of each."""
    power = block.spectrum.power[channel]
    starts, places = _columns(power.size, block.spectrum.bin_hz, low_hz, high_hz)
    last = min(power.size, int(high_hz / block.spectrum.bin_hz) + 1)
    largest = np.maximum.reduceat(power[: max(last, int(starts[-1]) + 1)], starts)
    return places, largest * noise_bandwidth_bins(block.spectrum.frames)


def _stretch(block: Block, channel: int) -> tuple[Samples, NDArray[np.intp]]:
    """Return phase (cycles from a rising zero crossing) and frames of two periods in the middle of the block."""
    fit = block.fit
    cycles = fit.frequency_hz / fit.rate_hz
    centre = (fit.frames - 1) / 2.0
    turn = float(np.angle(fit.coefficients[channel, 0])) / (2.0 * np.pi) + 0.25
    crossing = centre + (np.ceil(turn - PERIODS / 2.0) - turn) / cycles
    first = int(np.clip(np.ceil(crossing), 0, fit.frames - 1))
    count = min(int(PERIODS / cycles) + 1, fit.frames - first)
    step = max(1, -(-count // MOST_POINTS))
    frames = np.arange(first, first + count, step, dtype=np.intp)
    phase = (frames.astype(np.float64) - centre) * cycles + turn
    return phase - float(np.floor(phase[0] + 1e-9)), frames


def draw(block: Block, channel: int, reading: Reading) -> Picture:
    """Return the picture of one channel (index from 0) of a block that holds a tone."""
    fit = block.fit
    phase, frames = _stretch(block, channel)
    coefficients = fit.coefficients[channel]
    peak = float(abs(coefficients[0])) or 1.0
    orders = np.array(fit.model.orders[1:], dtype=np.float64)
    beyond = coefficients[fit.model.ramp + 1 :]
    cycles = np.outer(frames - (fit.frames - 1) / 2.0, orders) * (fit.frequency_hz / fit.rate_hz)
    turns = 2.0 * np.pi * np.remainder(cycles, 1.0)
    harmonics = np.cos(turns) @ beyond.real - np.sin(turns) @ beyond.imag
    residual = block.left[channel].ravel()[frames] + harmonics
    output = block.samples[channel].ravel()[frames] - fit.dc[channel]
    settings = reading.settings
    places, squares = spectrum_columns(block, channel, settings.low_hz, min(settings.high_hz, block.rate_hz / 2.0))
    return Picture(
        reading=reading,
        phase_cycles=phase,
        residual=residual / peak,
        output=output / peak,
        spectrum_hz=places,
        spectrum_ratio=np.sqrt(2.0 * squares) / peak,
        noise_bandwidth_hz=noise_bandwidth_bins(block.spectrum.frames) * block.spectrum.bin_hz,
        window=WINDOW,
    )
