"""Conversions between plain ratios and the trade's logarithmic units. Inside, everything is a plain ratio."""

import math

ZERO_DBU_VRMS = math.sqrt(0.6)  # 1 mW in 600 Ω, no load implied: √(0.001 W · 600 Ω)
DB_PER_RELATIVE = 20.0 / math.log(10.0)  # d(20 lg x) = DB_PER_RELATIVE · dx/x
SINE_PEAK_TO_RMS = math.sqrt(2.0)


def db(ratio: float) -> float:
    """Return 20 lg of an amplitude ratio, in dB; −inf for zero.

    Raises:
        ValueError: the ratio is negative.
    """
    return 20.0 * math.log10(ratio) if ratio else -math.inf


def from_db(level_db: float) -> float:
    """Return the amplitude ratio of a level in dB."""
    return math.pow(10.0, level_db / 20.0)


def power_w(level_vrms: float, load_ohm: float) -> float:
    """Return the power in W of a voltage (V rms) across a resistance (Ω)."""
    return level_vrms * level_vrms / load_ohm
