"""The quasi-peak detector of ITU-R BS.468-4: what a meter with its prescribed dynamics shows of a weighted signal.

A full-wave rectifier and two stages in a row that charge fast and discharge slowly. The Recommendation prescribes
readings of tone bursts and no circuit; these four time constants are our own least-squares fit to them.
"""

import math

import attrs
import numpy as np

from wattproof.core.signal import Samples

# Charge and discharge of both stages in s, fitted to the readings of single bursts of 5 kHz of 1 to 200 ms and of
# repeated bursts of 5 ms (ITU-R BS.468-4, 2.1 and 2.2), the weighting network before them.
CHARGE_S = (0.918e-3, 90.54e-3)
DISCHARGE_S = (185.5e-3, 157.0e-3)
SETTLE_S = 1.0  # six of the longer time constant: 0.3 % from rest
_LEAST_RATE_HZ = 40_000.0  # the rectified signal is looked at no more seldom than this
_STEADY_HZ, _STEADY_S = 1_000.0, 1.5
# Quasi-peak over rms of white Gaussian noise behind the network, 20 Hz to 20 kHz at 96 kHz: our own measurement, 20 s.
GAUSSIAN_NOISE = 1.668


@attrs.frozen
class Indication:
    """What the meter shows once it has settled: mean and highest of its needle, and how much the mean varies."""

    mean: float
    highest: float
    u: float


def indicated(weighted: Samples, rate_hz: float) -> Indication:
    """Return the indication for a weighted signal, shape (frames,); a steady sine of 1 kHz shows its rms.

    Raises:
        ValueError: shorter than the meter takes to settle.
    """
    needle = _needle(weighted, rate_hz) / _sine_gain(rate_hz)
    rate = needle.size / (weighted.size / rate_hz)
    settled = needle[math.ceil(SETTLE_S * rate) :]
    if settled.size < rate / 2.0:
        raise ValueError(
            f"{weighted.size / rate_hz:.2g} s are too short for the meter; take {SETTLE_S + 0.5:g} s or more"
        )
    alike_s = sum(DISCHARGE_S)  # the needle follows itself for about that long
    independent = max(settled.size / rate / alike_s, 2.0)
    u = float(settled.std()) / math.sqrt(independent - 1.0)
    return Indication(float(settled.mean()), float(settled.max()), u)


def highest(weighted: Samples, rate_hz: float) -> float:
    """Return the highest indication from rest on: what a burst shows."""
    return float(_needle(weighted, rate_hz).max() / _sine_gain(rate_hz))


def _needle(weighted: Samples, rate_hz: float) -> Samples:
    """Return the output of the second stage, at the rate or an even fraction of it."""
    step = max(1, int(rate_hz / _LEAST_RATE_HZ))
    rate = rate_hz / step
    charge1, charge2 = (-math.expm1(-1.0 / (rate * seconds)) for seconds in CHARGE_S)
    discharge1, discharge2 = (-math.expm1(-1.0 / (rate * seconds)) for seconds in DISCHARGE_S)
    first = second = 0.0
    shown = []
    for value in np.abs(weighted[::step]).tolist():
        first += (value - first) * (charge1 if value > first else discharge1)
        second += (first - second) * (charge2 if first > second else discharge2)
        shown.append(second)
    return np.array(shown)


_GAINS: dict[float, float] = {}


def _sine_gain(rate_hz: float) -> float:
    """Return what a steady sine of rms 1 shows before scaling, computed once for each rate."""
    if rate_hz not in _GAINS:
        at_s = np.arange(round(_STEADY_S * rate_hz)) / rate_hz
        needle = _needle(np.sqrt(2.0) * np.sin(2.0 * np.pi * _STEADY_HZ * at_s), rate_hz)
        _GAINS[rate_hz] = float(needle[-needle.size // 10 :].mean())
    return _GAINS[rate_hz]
