"""What the screen draws of a block: two periods of the residual, locked to the tone, and the noise by column."""

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from wattproof.core.picture import Picture
from wattproof.core.reading import Reading
from wattproof.core.signal import Samples
from wattproof.dsp.band import WINDOW, noise_bandwidth_bins
from wattproof.dsp.block import Block
from wattproof.dsp.grid import unit_phasors
from wattproof.dsp.prepared import Phasors

PERIODS = 2.0
MOST_POINTS = 1200
COLUMNS = 700
_MARGIN = 1024  # frames


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


def _harmonics(turning: Phasors, coefficients: Phasors) -> Samples:
    """Return Re Σ c·z^k for the orders k = 2, 3…, z of shape (frames,), by Horner's rule."""
    total = np.zeros_like(turning)
    for coefficient in coefficients[::-1]:
        total += coefficient
        total *= turning
    waveform: Samples = (total * turning).real
    return waveform


def _in_band(left: Samples, first: int, last: int, high_hz: float, rate_hz: float) -> Samples:
    """Return left[first:last + 1] without what lies above high_hz: the picture shows what the reading counts.

    An ideal low-pass by FFT; what stands to each side, faded in and out, keeps its ends clean.
    """
    count = last + 1 - first
    size = min(left.size, 1 << (count + _MARGIN).bit_length())
    begin = min(max(0, first - (size - count) // 2), left.size - size)
    piece = left[begin : begin + size].copy()
    before, after = first - begin, begin + size - last - 1
    piece[:before] *= _rise(before)
    piece[size - after :] *= _rise(after)[::-1]
    lines = np.fft.rfft(piece)
    lines[int(high_hz / rate_hz * size * (1.0 + 1e-6)) + 1 :] = 0.0
    limited: Samples = np.fft.irfft(lines, size)[before : size - after]
    return limited


@lru_cache(maxsize=256)
def _rise(frames: int) -> Samples:
    return 0.5 - 0.5 * np.cos(np.pi * (np.arange(frames) + 0.5) / max(frames, 1))


def draw(block: Block, channel: int, reading: Reading) -> Picture:
    """Return the picture of one channel (index from 0) of a block that holds a tone."""
    fit = block.fit
    phase, frames = _stretch(block, channel)
    coefficients = fit.coefficients[channel]
    peak = float(abs(coefficients[0])) or 1.0
    turning = unit_phasors(frames.astype(np.float64) - (fit.frames - 1) / 2.0, fit.frequency_hz / fit.rate_hz)
    high_hz = min(reading.settings.high_hz, fit.rate_hz / 2.0)
    left = _in_band(block.left[channel].ravel(), int(frames[0]), int(frames[-1]), high_hz, fit.rate_hz)
    residual = left[frames - frames[0]] + _harmonics(turning, coefficients[fit.model.ramp + 1 :])
    output = block.samples[channel].ravel()[frames] - fit.dc[channel]
    places, squares = spectrum_columns(block, channel, reading.settings.low_hz, high_hz)
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
