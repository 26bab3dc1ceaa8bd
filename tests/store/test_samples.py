"""Samples come back bit for bit, in the smallest coding that holds them."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from wattproof.store.samples import Coding, decoded, encoded
from wattproof.store.session_values import Stretch
from wattproof.store.stretches import Coverage


def _noise(bits: int, frames: int = 500, channels: int = 2) -> "np.ndarray[tuple[int, int], np.dtype[np.float64]]":
    dice = np.random.default_rng(bits)
    return np.asarray(dice.integers(-(2 ** (bits - 1)), 2 ** (bits - 1), (frames, channels)) / 2.0 ** (bits - 1))


@pytest.mark.parametrize(
    ("samples", "rate_hz", "coding"),
    [
        (_noise(16), 48_000.0, Coding.FLAC16),
        (_noise(24), 96_000.0, Coding.FLAC24),
        (_noise(24, channels=8), 192_000.0, Coding.FLAC24),
        (_noise(24, channels=9), 192_000.0, Coding.FLOAT32),  # RFC 9639: at most 8 channels
        (_noise(24), 44_100.5, Coding.FLOAT32),  # and whole rates
        (_noise(32), 96_000.0, Coding.FLOAT64),
        (np.array([[1.0], [-1.0]]), 48_000.0, Coding.FLOAT32),  # +1 is one step more than integers reach
        (np.array([[1.5], [0.1]]), 48_000.0, Coding.FLOAT64),
        (np.zeros((7, 1)), 48_000.0, Coding.FLAC16),
    ],
)
def test_samples_come_back_bit_for_bit(
    samples: "np.ndarray[tuple[int, int], np.dtype[np.float64]]", rate_hz: float, coding: Coding
) -> None:
    found, content = encoded(samples, rate_hz)
    assert found is coding
    np.testing.assert_array_equal(decoded(found, content, *samples.shape), samples)


@pytest.mark.parametrize("coding", Coding)
def test_bytes_of_anything_else_are_refused(coding: Coding) -> None:
    with pytest.raises(ValueError, match="cannot be"):
        decoded(coding, b"anything else", 10, 1)
    samples = _noise(16)
    found, content = encoded(samples, 48_000.0)
    with pytest.raises(ValueError, match="500 frames of 2 channels are there, not 501 of 2"):
        decoded(found, content, 501, 2)


@given(st.lists(st.tuples(st.integers(0, 60), st.integers(1, 25)), max_size=12), st.integers(0, 60), st.integers(1, 25))
def test_what_is_missing_is_what_no_stretch_covers(known: list[tuple[int, int]], first: int, frames: int) -> None:
    coverage = Coverage([Stretch(*each) for each in known])
    covered = {frame for at, count in known for frame in range(at, at + count)}
    missing = [
        frame for part in coverage.missing(Stretch(first, frames)) for frame in range(part.first_frame, part.end_frame)
    ]
    assert missing == [frame for frame in range(first, first + frames) if frame not in covered]
