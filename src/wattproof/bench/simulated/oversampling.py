"""Raises and lowers the sample rate around a curved characteristic, so that its harmonics do not fold into the band.

Linear-phase windowed-sinc filters, applied chunk by chunk as overlap-save convolution with real Fourier transforms
(A. V. Oppenheim and R. W. Schafer, Discrete-Time Signal Processing, 8.7.3). Every chunk has the same size, so a
sample never depends on how its readers cut their blocks.
"""

import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples

Spectrum = NDArray[np.complex128]

DELAY_FRAMES = 64  # of one filter, at the low rate: half its length
# Kaiser's design formulas: 120 dB of attenuation give beta = 0.1102 (120 - 8.7), and with 128 frames of length a
# transition of 0.061 of the rate around its half: flat to 20.7 kHz at 44.1 kHz.
KAISER_BETA = 12.3


def _kernel_spectrum(factor: int, frames: int) -> Spectrum:
    """Return the filter's transfer function on the high rate, from 0 to where only its stop band is left."""
    reach = DELAY_FRAMES * factor
    index = np.arange(-reach, reach + 1)
    kernel = np.sinc(index / factor) * np.kaiser(index.size, KAISER_BETA) / factor
    return np.asarray(np.fft.rfft(kernel, 2 * frames * factor)[: frames + _beyond(frames) + 1], dtype=np.complex128)


def _beyond(frames: int) -> int:
    """Return how many lines above half the low rate are worth reckoning with: twice the transition's upper half.

    What lies above is stopped by 120 dB and more; leaving it out stops it wholly.
    """
    return frames // 8


class Upsampler:
    """Turns chunks of shape (channels, frames) into chunks of shape (channels, frames · factor)."""

    def __init__(self, channels: int, frames: int, factor: int) -> None:
        self._points = 2 * frames * factor
        self._beyond = _beyond(frames)
        self._spectrum = _kernel_spectrum(factor, frames) * factor
        self._last: Samples = np.zeros((channels, frames))

    def push(self, chunk: Samples) -> Samples:
        """Return the next chunk at the high rate, DELAY_FRAMES later than the given one."""
        half = np.fft.rfft(np.concatenate([self._last, chunk], axis=1), axis=1)
        self._last = chunk
        image = np.conj(half[:, -2 : -2 - self._beyond : -1])  # the lines above half the low rate mirror those below
        product = np.concatenate([half, image], axis=1)
        product *= self._spectrum
        both = np.fft.irfft(product, self._points, axis=1)
        return np.asarray(both[:, self._points // 2 :], dtype=np.float64)


class Downsampler:
    """Turns chunks of shape (channels, frames · factor) into chunks of shape (channels, frames)."""

    def __init__(self, channels: int, frames: int, factor: int) -> None:
        self._frames = frames
        self._beyond = _beyond(frames)
        self._spectrum = _kernel_spectrum(factor, frames) / factor
        self._last: Samples = np.zeros((channels, frames * factor))

    def push(self, chunk: Samples) -> Samples:
        """Return the next chunk at the low rate, DELAY_FRAMES later than the given one."""
        lines = np.fft.rfft(np.concatenate([self._last, chunk], axis=1), axis=1)
        self._last = chunk
        product = lines[:, : self._spectrum.size] * self._spectrum
        folded = product[:, : self._frames + 1]
        mirrored = np.conj(product[:, : self._frames : -1])
        folded[:, self._frames - self._beyond : self._frames] += mirrored  # as taking every factor-th sample folds it
        folded[:, self._frames] += np.conj(folded[:, self._frames])  # half the rate meets its own mirror image
        both = np.fft.irfft(folded, 2 * self._frames, axis=1)
        return np.asarray(both[:, self._frames :], dtype=np.float64)
