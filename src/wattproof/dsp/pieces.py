"""A tone's complex amplitude piece by piece on one grid of absolute frames, carried on from block to block."""

import math

import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.dsp.grid import unit_phasors
from wattproof.dsp.subblocks import width_for

Phasors = NDArray[np.complex128]
HOP_S = 0.005  # half a piece; longer where a piece would hold fewer than 4 cycles
MOST_PIECES = 240  # 1.2 s of a tone above 400 Hz


class Pieces:
    """Hann-weighted pieces of two hops that overlap by half, of every channel, from one unbroken stretch of samples.

    `amplitude` is complex, shape (pieces, channels), against a carrier that runs from frame 0 of the bench;
    `rest` is the mean square beside the tone, same shape. Piece i starts at frame `origin` + i·`hop`.
    """

    def __init__(self, rate_hz: float, frequency_hz: float) -> None:
        self.hop = width_for(frequency_hz, rate_hz, 2.0 * HOP_S) // 2
        self._cycles = frequency_hz / rate_hz
        bins = 4.0 * self.hop * self._cycles
        self.leak = 1.0 / (math.pi * bins * (bins * bins - 1.0))  # of the sine's mirror, by the Hann window's transform
        rise = 0.5 - 0.5 * np.cos(np.pi * np.arange(self.hop) / self.hop)
        carrier = unit_phasors(np.arange(self.hop, dtype=np.float64), self._cycles).conj()
        shapes = np.stack([rise, 1.0 - rise])
        weights = (shapes * carrier).T * (2.0 / self.hop)
        self._weights = np.ascontiguousarray(weights).view(np.float64)  # (hop, 4): re and im of rise and of fall
        self._shapes = shapes / self.hop
        self.restart(0)

    def restart(self, first_frame: int) -> None:
        """Forget everything; the next samples start at first_frame."""
        self.origin = self.end = first_frame
        self._left: Samples | None = None
        self._halves: list[tuple[Phasors, Samples]] = []
        self._joined: tuple[Phasors, Samples] | None = None

    def take(self, samples: Samples) -> None:
        """Take the next samples, shape (frames, channels), from frame `end` on."""
        self.end += len(samples)
        rest = samples if self._left is None else np.concatenate([self._left, samples])
        rows = len(rest) // self.hop
        self._left = rest[rows * self.hop :].copy()
        if not rows:
            return
        first = self.end - len(rest)
        blocks = rest[: rows * self.hop].reshape(rows, self.hop, -1).transpose(0, 2, 1)
        halves = (blocks @ self._weights).view(np.complex128)
        starts = (first + self.hop * np.arange(rows, dtype=np.float64)) * self._cycles
        halves *= unit_phasors(starts % 1.0, 1.0).conj()[:, None, None]
        self._halves.append((halves, blocks**2 @ self._shapes.T))
        self._joined = None

    @property
    def amplitude(self) -> Phasors:
        """Complex peak amplitude of each piece, shape (pieces, channels)."""
        return self._all()[0]

    @property
    def rest(self) -> Samples:
        """Mean square of what is not the tone, shape (pieces, channels)."""
        return self._all()[1]

    def _all(self) -> tuple[Phasors, Samples]:
        if self._joined is None:
            self._joined = self._join()
        return self._joined

    def _join(self) -> tuple[Phasors, Samples]:
        if not self._halves:
            return np.zeros((0, 1), dtype=np.complex128), np.zeros((0, 1))
        halves = np.concatenate([half for half, _ in self._halves])
        squares = np.concatenate([square for _, square in self._halves])
        beyond = len(halves) - MOST_PIECES
        if beyond > 0:
            halves, squares = halves[beyond:], squares[beyond:]
            self.origin += beyond * self.hop
        self._halves = [(halves, squares)]
        amplitude = halves[:-1, :, 0] + halves[1:, :, 1]
        tone = (amplitude.real**2 + amplitude.imag**2) / 2.0
        return amplitude, squares[:-1, :, 0] + squares[1:, :, 1] - tone
