"""The exponential sweep as samples: each octave takes equally long (A. Farina, AES 108th Convention, 2000, 5093)."""

import math

import numpy as np

from wattproof.core.signal import Samples, Sweep
from wattproof.signals.ramp import RAMP_S, raised_cosine


def sweep_samples(sweep: Sweep, rate_hz: float) -> Samples:
    """Return the samples of a sweep, peak `level_fs`, shape (frames,): ramps of RAMP_S at both ends.

    Raises:
        ValueError: it ends at half the rate or above, or is shorter than its ramps.
    """
    if sweep.end_hz >= rate_hz / 2.0:
        raise ValueError(f"a sweep to {sweep.end_hz:g} Hz does not fit {rate_hz:g} Hz; end below half the rate")
    frames, ramp = math.ceil(sweep.seconds * rate_hz), math.ceil(RAMP_S * rate_hz)
    if frames < 2 * ramp:
        raise ValueError(f"a sweep of {sweep.seconds:g} s is shorter than its ramps; give at least {2 * RAMP_S:g} s")
    e_fold_s = sweep.seconds / math.log(sweep.end_hz / sweep.frequency_hz)
    at_s = np.arange(frames, dtype=np.float64) / rate_hz
    cycles = sweep.frequency_hz * e_fold_s * np.expm1(at_s / e_fold_s)
    samples = sweep.level_fs * np.sin(2.0 * np.pi * (cycles % 1.0))
    rise = raised_cosine(ramp)
    samples[:ramp] *= rise
    samples[-ramp:] *= rise[::-1]
    return np.asarray(samples, dtype=np.float64)
