"""Raw samples as compressed bytes and back, without losing a bit: FLAC where the sample format allows, else floats."""

import io
import zlib
from enum import StrEnum
from typing import Final

import numpy as np
import soundfile

from wattproof.core.signal import Samples

_MOST_FLAC_CHANNELS: Final = 8  # RFC 9639, 4.2
_MOST_FLAC_HZ: Final = 655_350  # RFC 9639, 9.1.2: what the frame header can say
_FLAC_LEVEL: Final = 0.4  # of 0 to 1: beyond it a capture takes twice the time for a per cent of its size
_DEFLATE_LEVEL: Final = 3


class Coding(StrEnum):
    """How samples were turned into bytes. The values are stored."""

    FLAC16 = "flac 16"
    FLAC24 = "flac 24"
    FLOAT32 = "deflated float32"
    FLOAT64 = "deflated float64"


_BITS = {Coding.FLAC16: 16, Coding.FLAC24: 24}
_FLOATS: dict[Coding, "np.dtype[np.floating]"] = {Coding.FLOAT32: np.dtype("<f4"), Coding.FLOAT64: np.dtype("<f8")}


def encoded(samples: Samples, rate_hz: float) -> tuple[Coding, bytes]:
    """Return the smallest lossless coding of samples, shape (frames, channels), and its bytes."""
    if samples.shape[1] <= _MOST_FLAC_CHANNELS and rate_hz == int(rate_hz) <= _MOST_FLAC_HZ:
        for coding, bits in _BITS.items():
            scaled = samples * 2.0 ** (bits - 1)
            whole = scaled.astype(np.int32) if np.all(np.abs(scaled) <= 2.0 ** (bits - 1)) else None
            if whole is not None and np.array_equal(whole, scaled) and scaled.max(initial=0.0) < 2.0 ** (bits - 1):
                return coding, _flac(whole << (32 - bits), int(rate_hz), bits)
    single = samples.astype(np.float32)
    coding = Coding.FLOAT32 if np.array_equal(single, samples) else Coding.FLOAT64
    return coding, _deflated(samples.astype(_FLOATS[coding]))


def decoded(coding: Coding, content: bytes, frames: int, channels: int) -> Samples:
    """Return the samples, shape (frames, channels), float64.

    Raises:
        ValueError: the bytes are not what they should be.
    """
    if coding in _BITS:
        try:
            samples, _ = soundfile.read(io.BytesIO(content), dtype="float64", always_2d=True)
        except soundfile.LibsndfileError as error:
            raise ValueError(f"the FLAC stream cannot be decoded: {error}") from error
    else:
        samples = _inflated(content, _FLOATS[coding], frames, channels)
    if samples.shape != (frames, channels):
        raise ValueError(
            f"{samples.shape[0]} frames of {samples.shape[1]} channels are there, not {frames} of {channels}"
        )
    return np.asarray(samples)


def _flac(whole: "np.ndarray[tuple[int, int], np.dtype[np.int32]]", rate_hz: int, bits: int) -> bytes:
    file = io.BytesIO()
    with soundfile.SoundFile(
        file,
        "w",
        rate_hz,
        whole.shape[1],
        subtype=f"PCM_{bits}",
        format="FLAC",
        compression_level=_FLAC_LEVEL,
    ) as flac:
        flac.write(whole)
    return file.getvalue()


def _deflated(floats: "np.ndarray[tuple[int, int], np.dtype[np.floating]]") -> bytes:
    """Put the first bytes of all numbers together, then the second ones: what is alike lies side by side."""
    planes = floats.view(np.uint8).reshape(-1, floats.dtype.itemsize).T
    return zlib.compress(planes.tobytes(), _DEFLATE_LEVEL)


def _inflated(content: bytes, kind: "np.dtype[np.floating]", frames: int, channels: int) -> Samples:
    try:
        plain = zlib.decompress(content)
    except zlib.error as error:
        raise ValueError(f"the floats cannot be decompressed: {error}") from error
    if len(plain) != frames * channels * kind.itemsize:
        raise ValueError(f"{len(plain)} bytes are there, not {frames * channels * kind.itemsize}")
    numbers = np.frombuffer(plain, np.uint8).reshape(kind.itemsize, -1).T
    return np.ascontiguousarray(numbers).view(kind).reshape(frames, channels).astype(np.float64)
