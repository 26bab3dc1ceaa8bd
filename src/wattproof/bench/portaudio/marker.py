"""A quiet marker that measures the round trip: what it is, and where in a capture it came back."""

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core import checks
from wattproof.core.signal import Samples

LENGTH_S = 0.020
LOW_HZ, HIGH_HZ = 1_000.0, 9_000.0  # wide enough that one period of it is not taken for the next
LEAST_LIKENESS = 0.5  # noise alone reaches about 0.1 over the marker's time-bandwidth product of 160


@attrs.frozen
class Marker:
    """A chirp of LENGTH_S at a quiet level, played once where the caller wants the round trip measured.

    It goes where a tone would go, so into the amplifier: choose a level that nothing behind it minds.
    """

    level_fs: float = attrs.field(default=0.01, validator=checks.within(0.0, 0.1))
    output: int = attrs.field(default=1, validator=checks.counted_from_one)
    input: int = attrs.field(default=1, validator=checks.counted_from_one)


@attrs.frozen
class RoundTrip:
    """Frames from an output's sample to the same sample in the capture: measured, or a bound that is not exceeded."""

    frames: int
    measured: bool


def waveform(rate_hz: float) -> NDArray[np.float32]:
    """Return the marker, peak at most 1, shape (frames,): a linear chirp under a Hann window."""
    frames = round(LENGTH_S * rate_hz)
    at = np.arange(frames) / rate_hz
    cycles = LOW_HZ * at + (HIGH_HZ - LOW_HZ) / (2.0 * LENGTH_S) * at * at
    return (np.hanning(frames) * np.sin(2.0 * np.pi * cycles)).astype(np.float32)


def find(captured: Samples, marker: NDArray[np.float32]) -> int | None:
    """Return the frame of `captured`, shape (frames,), at which the marker begins; None where it is not there.

    The place of the largest normalised correlation, of either sign.
    """
    size = 1 << (len(captured) + len(marker) - 1).bit_length()
    spectrum = np.fft.rfft(captured, size) * np.conj(np.fft.rfft(marker.astype(np.float64), size))
    places = len(captured) - len(marker) + 1
    likeness = np.abs(np.fft.irfft(spectrum, size)[:places])
    begin = int(np.argmax(likeness))
    energy = float(np.sum(captured[begin : begin + len(marker)] ** 2) * np.sum(marker.astype(np.float64) ** 2))
    if energy <= 0.0 or likeness[begin] < LEAST_LIKENESS * np.sqrt(energy):
        return None
    return begin
