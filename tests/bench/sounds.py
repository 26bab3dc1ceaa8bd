"""Sound files for tests, made in memory: a tone in any format that soundfile writes."""

import io

import numpy as np
import soundfile

from wattproof.core.signal import Samples

RATE_HZ = 48_000


def tone(seconds: float = 1.0, channels: int = 2, peak: float = 0.5) -> Samples:
    """Return 997 Hz with a little noise, so that every part of a coded file differs; shape (frames, channels)."""
    frames = round(seconds * RATE_HZ)
    sine = peak * np.sin(2.0 * np.pi * 997.0 / RATE_HZ * np.arange(frames))
    noise = 1e-3 * np.random.default_rng(4).standard_normal((frames, channels))
    return np.asarray(sine[:, None] * np.linspace(1.0, 0.5, channels) + noise, dtype=np.float64)


def encoded(form: str, subtype: str, samples: Samples | None = None, rate_hz: int = RATE_HZ) -> bytes:
    """Return a file's bytes."""
    buffer = io.BytesIO()
    soundfile.write(buffer, tone() if samples is None else samples, rate_hz, format=form, subtype=subtype)
    return buffer.getvalue()


def flipped(content: bytes, position: int, bit: int = 2) -> bytes:
    """Return the bytes with one bit turned over."""
    turned = bytearray(content)
    turned[position] ^= 1 << bit
    return bytes(turned)
