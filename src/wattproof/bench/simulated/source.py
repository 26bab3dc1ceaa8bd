"""The tone as the simulated output converter is given it: ramped whenever it changes."""

import math

import numpy as np
from numpy.typing import NDArray

from wattproof.bench.simulated.phase import oscillate
from wattproof.core.signal import Samples, Sweep, Tone

RAMP_S = 0.010  # common practice, no source: long enough for no click, short enough to be silent within 0.1 s


class Source:
    """Sounds one tone or none. A change takes effect at a chunk's start and is over before its end."""

    def __init__(self, channels: int, rate_hz: float, clock_ratio: float) -> None:
        self._channels, self._rate_hz, self._clock_ratio = channels, rate_hz, clock_ratio
        self.ramp_frames = math.ceil(RAMP_S * rate_hz)
        self._rise = 0.5 * (1.0 - np.cos(np.pi * np.arange(1, self.ramp_frames + 1) / self.ramp_frames))
        self._tone: Tone | None = None
        self._began: int | None = 0  # the frame at which the tone came
        self._before: Tone | None = None

    def sound(self, tone: Tone | None) -> None:
        """Change to another tone, or to silence, from the next chunk on."""
        self._tone = tone
        self._began = None

    def chunk(self, first_frame: int, frames: int) -> Samples:
        """Return the samples from first_frame on, shape (channels, frames), in full-scale units."""
        if self._began is None:
            self._began = first_frame
        after = self._samples(self._tone, first_frame, frames)
        if self._tone != self._before:
            before = self._samples(self._before, first_frame, self.ramp_frames)
            after[:, : self.ramp_frames] *= self._rise
            after[:, : self.ramp_frames] += before * (1.0 - self._rise)
            self._before = self._tone
        return after

    def _samples(self, tone: Tone | None, first_frame: int, frames: int) -> Samples:
        samples = np.zeros((self._channels, frames))
        if tone is None or tone.level_fs == 0.0:
            return samples
        if isinstance(tone, Sweep):
            sine = self._swept(tone, first_frame - (self._began or 0) + np.arange(frames))
        else:
            sine = oscillate(tone.frequency_hz * self._clock_ratio, self._rate_hz, first_frame, frames)
        for output in tone.outputs:
            samples[output - 1] = tone.level_fs * sine
        return samples

    def _swept(self, sweep: Sweep, at: NDArray[np.int64]) -> Samples:
        """Return a sweep's samples of peak 1 at frames counted from its first; nothing outside it."""
        count = math.ceil(sweep.seconds * self._rate_hz)
        octave_s = sweep.seconds / math.log2(sweep.end_hz / sweep.frequency_hz)
        seconds = np.clip(at, 0, count - 1) / self._rate_hz
        octaves = seconds / octave_s
        cycles = sweep.frequency_hz * octave_s / math.log(2.0) * (np.exp2(octaves) - 1.0)
        edge = np.clip((count - at) / self.ramp_frames, 0.0, 1.0)  # the rise is that of every change
        weight = 0.5 - 0.5 * np.cos(np.pi * edge)
        return np.asarray(np.sin(2.0 * np.pi * (cycles % 1.0)) * weight, dtype=np.float64)
