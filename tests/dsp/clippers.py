"""Curves of THD+N against output of ideal amplifiers, by a plain Fourier transform of one period."""

from collections.abc import Callable

import numpy as np

from wattproof.core.signal import Samples
from wattproof.dsp.onset import Curve

POINTS = 8192
HARMONICS = 20  # 997 Hz up to 20 kHz
GEOMETRIC_VRMS = 1.0 / np.sqrt(2.0)  # the largest sine that a clipper at ±1 passes untouched
SINE = np.sin(2.0 * np.pi * np.arange(POINTS) / POINTS)
Curving = Callable[[Samples], Samples]


def hard(wave: Samples) -> Samples:
    """Return a wave clipped at ±1."""
    return np.clip(wave, -1.0, 1.0)


def crossed_over(wave: Samples, step: float) -> Samples:
    """Return a wave with a dead zone of ±step, clipped at ±1."""
    return hard(np.sign(wave) * np.maximum(np.abs(wave) - step, 0.0))


def read_at(curving: Curving, peak: float, noise_vrms: float = 0.0) -> tuple[float, float]:
    """Return (V rms, THD+N to the total) of a sine of that peak through a curve, noise added in power."""
    lines = np.abs(np.fft.rfft(curving(peak * SINE))[1 : HARMONICS + 1]) / POINTS * np.sqrt(2.0)
    rest = float((lines[1:] ** 2).sum()) + noise_vrms**2
    total = float(lines[0] ** 2) + rest
    return float(np.sqrt(total)), float(np.sqrt(rest / total))


def curve_through(  # noqa: PLR0913 - a curve is drawn with this many choices
    curving: Curving,
    *,
    from_db: float = -45.0,
    to_db: float = 3.0,
    step_db: float = 0.1,
    noise_vrms: float = 1e-4,
    scatter: float = 0.0,
    seed: int = 1,
) -> Curve:
    """Return the curve of an amplifier whose drive rises by steps; `scatter` is relative, of each THD+N."""
    dice = np.random.default_rng(seed)
    drives = 10.0 ** (np.arange(from_db, to_db, step_db) / 20.0)
    read = np.array([read_at(curving, float(drive), noise_vrms) for drive in drives])
    rising = np.concatenate([[True], np.diff(np.maximum.accumulate(read[:, 0])) > 1e-9])
    volts, thdn = read[rising].T
    thdn = thdn * (1.0 + scatter * dice.standard_normal(thdn.size))
    return Curve(volts, thdn, thdn * max(scatter, 1e-5))
