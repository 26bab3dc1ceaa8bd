"""The live reader for curves of distortion against level: short blocks, and no kink of clipping taken for a jump."""

from wattproof.core.reading import ReadingSettings
from wattproof.dsp.live import LiveReader
from wattproof.dsp.movement import HAND_KINK

MOST_DB_ON_CURVE = 0.12  # our own measurement: a block that moves by this averages 0.01 dB away at 1 % THD+N


def curve_reader(rate_hz: float, settings: tuple[ReadingSettings, ...]) -> LiveReader:
    """Return a reader for one row of a power statement."""
    return LiveReader(rate_hz, settings, most_db_per_block=MOST_DB_ON_CURVE, kink=HAND_KINK, refined=True)
