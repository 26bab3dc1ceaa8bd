"""How a tone's level moves over a block of a live capture, and where it jumps."""

import attrs
import numpy as np

from wattproof.core.signal import Samples
from wattproof.core.units import DB_PER_RELATIVE
from wattproof.dsp.subblocks import sub_blocks, width_for

LONGEST_MOVING_S = 0.05

_MOVING_DB = 0.02  # a level that moves less than this over a still block is still: false residual below −110 dB
_STEP = 0.08  # relative change of level, or phase in rad, from one short piece to the next that no hand makes
_SURE = 6.0  # and it must stand this far over the scatter of the pieces


@attrs.frozen
class Movement:
    """How the level moves over a block, and where it jumps (frame in the block, dB), if it does."""

    db_per_s: float
    jump: tuple[int, float] | None = None


def movement_of(samples: Samples, rate_hz: float, frequency_hz: float) -> Movement:
    """Return how the tone in samples, shape (frames,), moves: the faster of its slope and that of its last 50 ms."""
    pieces = sub_blocks(samples, rate_hz, frequency_hz, width_for(frequency_hz, rate_hz, 0.006))
    if pieces.amplitude.size < 4:
        return Movement(0.0)
    level = pieces.level
    steps = np.diff(level)
    turns = pieces.turns
    bend = np.abs(steps - _middle(steps)) + np.abs(turns - _middle(turns))
    typical = _middle(bend)
    worst = int(np.argmax(bend))
    if bend[worst] > max(_STEP, 3.0 * _SURE * typical):
        return Movement(0.0, ((worst + 1) * pieces.hop, float(steps[worst]) * DB_PER_RELATIVE))
    tail = max(4, round(LONGEST_MOVING_S * rate_hz / pieces.hop))
    slope, scatter = _slope(level[-tail:])
    whole, whole_scatter = _slope(level)
    moved = abs(whole) * level.size
    still = moved * DB_PER_RELATIVE < _MOVING_DB or moved < _SURE * whole_scatter
    if still and abs(slope) * tail < max(_SURE * scatter, _MOVING_DB / DB_PER_RELATIVE):
        return Movement(0.0)
    fastest = max(abs(slope), abs(whole)) * np.sign(slope if abs(slope) >= abs(whole) else whole)
    return Movement(float(fastest) * DB_PER_RELATIVE * rate_hz / pieces.hop)


def _middle(values: Samples) -> float:
    """Return the upper median: np.median spends ten times as long on short arrays."""
    half = values.size // 2
    return float(np.partition(values, half)[half])


def _slope(level: Samples) -> tuple[float, float]:
    """Return the slope per piece of a straight line, and the standard uncertainty of the whole rise."""
    place = np.arange(level.size) - (level.size - 1) / 2.0
    spread = float(place @ place)
    slope = float(place @ level) / spread
    left = level - level.mean() - slope * place
    scatter = float(np.sqrt(left @ left / max(1, level.size - 2)))
    return slope, scatter * level.size / spread**0.5
