"""What a device really delivers: 16 bit, 24 bit or float, and which bits are never used, estimated from the samples."""

import math

import attrs
import numpy as np

from wattproof.core.signal import Samples

MOST_BITS = 24  # what a float32 sample, in which audio systems hand everything on, can hold exactly
_LEAST_BITS = 8
_LEAST_VALUES = 16  # different values, without which a word length cannot be told


@attrs.frozen
class SampleFormat:
    """The word length of one channel.

    `bits` is the length of the words that reach us, 8 to 24; None where the samples are no whole codes, so float or
    processed; 0 where there are too few different values to tell. `idle_bits` are the places below the highest that is
    used which no sample ever set otherwise than its neighbours' sign, counted from 1 (the highest) to 24.
    """

    bits: int | None
    idle_bits: tuple[int, ...] = ()

    @property
    def name(self) -> str:
        """In short: "16 bit", "float", "unknown"."""
        if self.bits is None:
            return "float"
        return f"{self.bits} bit" if self.bits else "unknown"


def sample_format(samples: Samples) -> SampleFormat:
    """Return the format of one channel's raw samples, shape (frames,), in full-scale units.

    The shortest word is sought in which every sample is a whole code. A channel with less than 16 different values
    tells nothing: digital silence fits every word.
    """
    codes = samples * 2.0 ** (MOST_BITS - 1)
    whole = np.rint(codes)
    if np.unique(samples[: 1 << 16]).size < _LEAST_VALUES:
        return SampleFormat(0)
    if not np.array_equal(codes, whole):
        return SampleFormat(None)
    words = whole.astype(np.int64)
    used = int(np.bitwise_or.reduce(words ^ (words >> 63)))  # without the sign's own copies above the value
    lowest = _lowest_place(words)
    bits = max(_LEAST_BITS, MOST_BITS - lowest)
    places = range(lowest, max(used.bit_length() - 1, lowest))
    idle = tuple(MOST_BITS - place for place in reversed(places) if not _varies(words, place))
    return SampleFormat(bits, idle)


def unused_low_bits(form: SampleFormat) -> int:
    """Return how many bits at the low end of a 24-bit word are never used; 0 where that cannot be said."""
    return MOST_BITS - form.bits if form.bits else 0


def best_possible_db(form: SampleFormat) -> float | None:
    """Return the signal to noise ratio that a word of this length cannot exceed, dB; None for float or unknown.

    A full-scale sine over the rounding of an ideal converter: 20·lg(2^bits·√1.5) (IEEE Std 1241-2010, 4.5.1).
    """
    return 20.0 * math.log10(2.0**form.bits * math.sqrt(1.5)) if form.bits else None


def _lowest_place(words: "np.ndarray[tuple[int, ...], np.dtype[np.int64]]") -> int:
    any_set = int(np.bitwise_or.reduce(words))
    return (any_set & -any_set).bit_length() - 1


def _varies(words: "np.ndarray[tuple[int, ...], np.dtype[np.int64]]", place: int) -> bool:
    bit = (words >> place) & 1
    return bool(bit.min() != bit.max())
