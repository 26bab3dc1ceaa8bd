"""Signals with a closed-form truth, made without any code of the project: phases are reduced to a cycle in 80 bits."""

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture, Samples
from wattproof.procedures.read_recording import read_recording

Curve = NDArray[np.float64] | float


def cycles(frames: int, rate_hz: float, frequency_hz: float, start_frame: int = 0) -> NDArray[np.longdouble]:
    """Return frame·f/rate reduced to one cycle, in extended precision: float64 alone would leave −243 dB after 1 s."""
    turn = np.longdouble(frequency_hz) / np.longdouble(rate_hz)
    frame = np.arange(frames, dtype=np.longdouble) + start_frame
    return np.asarray(np.remainder(frame * turn, np.longdouble(1.0)))


def sine(  # noqa: PLR0913 - a sine and what may ride on it
    frames: int,
    rate_hz: float,
    frequency_hz: float,
    *,
    peak: Curve = 1.0,
    phase_rad: float = 0.0,
    harmonics: Mapping[int, tuple[float, float]] | None = None,
    start_frame: int = 0,
) -> Samples:
    """Return peak·[sin θ + Σ ratio·sin(kθ + phase)], θ = 2πft + phase_rad, shape (frames,).

    `harmonics` maps order to (ratio to the fundamental, phase in rad).
    """
    turns = cycles(frames, rate_hz, frequency_hz, start_frame) + np.longdouble(phase_rad) / (2 * np.longdouble(np.pi))
    total = np.sin(_radians(turns))
    for order, (ratio, phase) in (harmonics or {}).items():
        total += ratio * np.sin(_radians(order * turns) + phase)
    return np.asarray(total * peak, dtype=np.float64)


def _radians(turns: NDArray[np.longdouble]) -> Samples:
    return 2.0 * np.pi * np.remainder(turns, 1).astype(np.float64)


def capture(*channels: Samples, rate_hz: float, first_frame: int = 0) -> Capture:
    """Return a capture of channels, each of shape (frames,)."""
    return Capture(np.stack(channels, axis=1), rate_hz, first_frame)


def read_one(samples: Samples, rate_hz: float, fundamental_hz: float | None = None, **settings: object) -> Reading:
    """Read one channel as a recording."""
    chosen = ReadingSettings(**settings)  # type: ignore[arg-type]  # attrs judges the values
    return read_recording(capture(samples, rate_hz=rate_hz), chosen, fundamental_hz=fundamental_hz)[0]


def read_ok(samples: Samples, rate_hz: float, fundamental_hz: float | None = None, **settings: object) -> Reading:
    """Read one channel as a recording that must be sound."""
    reading = read_one(samples, rate_hz, fundamental_hz, **settings)
    assert reading.state is State.OK, reading.notes
    return reading


def value(quantity: object) -> float:
    """Return the value of a quantity that must be there."""
    found = getattr(quantity, "value", None)
    assert isinstance(found, float), f"there is no value in {quantity}"
    return found


def db(ratio: float) -> float:
    """Return 20 lg of a ratio, −inf for zero."""
    return float(20.0 * np.log10(ratio)) if ratio else -np.inf
