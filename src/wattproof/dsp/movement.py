"""How a tone's level moves over a block of a live capture, and where it jumps."""

import math
from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples
from wattproof.core.units import DB_PER_RELATIVE
from wattproof.dsp.subblocks import sub_blocks, width_for

LONGEST_MOVING_S = 0.05

_MOVING_DB = 0.02  # a level that moves less than this over a still block is still: false residual below −110 dB
KINK = 4e-4  # how far level may bend over three short pieces: 60 % wobble at 3 Hz of a hand's 20 dB/s bends 2.3e-4
HAND_KINK = 4e-3  # an amplifier that begins to clip bends a hand's 20 dB/s by 6e-4; a dirty track by 0.03 and more
_TWIST = 0.008  # and turn, in rad: half of what the least usual loss of frames turns a tone of 997 Hz (0.019)
_SURE = 6.0  # and a slope must stand this far over the scatter of the pieces
_KINK_SURE = 12.0  # a kink or twist this far over the typical one: eight standard deviations of noise


@attrs.frozen
class Jump:
    """Where level or phase jump, or level begins or ends to move: `db` is by how much over three pieces.

    `first_frame` is where the first disturbed piece starts, `clear_frame` from where the block is undisturbed again;
    `twisted` tells that the phase jumped, so that frames are missing or repeated.
    """

    first_frame: int
    clear_frame: int
    db: float
    twisted: bool


@attrs.frozen
class Movement:
    """How the level moves over a block, or where it jumps last, if it does."""

    db_per_s: float
    jump: Jump | None = None


def movement_of(samples: Samples, rate_hz: float, frequency_hz: float, kink: float = KINK) -> Movement:
    """Return how the tone in samples, shape (frames,), moves: the faster of its slope and that of its last 50 ms.

    `kink` is by how much the level may bend over three short pieces before it jumps.
    """
    pieces = sub_blocks(samples, rate_hz, frequency_hz, width_for(frequency_hz, rate_hz, 0.006))
    if pieces.amplitude.size < 5:
        return Movement(0.0)
    level = pieces.level
    steps = level[1:] - level[:-1]
    turns = pieces.turns
    kinks = np.abs(steps[1:] - steps[:-1])
    twists = np.abs(turns - _middle(turns))
    twists = np.maximum(twists[1:], twists[:-1])
    twisted = twists > max(_TWIST, 1.5 * _KINK_SURE * _middle(twists))
    bent = kinks > max(kink, _KINK_SURE * _middle(kinks))
    places = (twisted | bent).nonzero()[0]
    if places.size:
        return Movement(0.0, _jump(places, twisted, level, pieces.hop))
    tail = max(4, round(LONGEST_MOVING_S * rate_hz / pieces.hop))
    slope, scatter = _slope(level[-tail:])
    whole, whole_scatter = _slope(level)
    moved = abs(whole) * level.size
    still = moved * DB_PER_RELATIVE < _MOVING_DB or moved < _SURE * whole_scatter
    if still and abs(slope) * tail < max(_SURE * scatter, _MOVING_DB / DB_PER_RELATIVE):
        return Movement(0.0)
    fastest = max(abs(slope), abs(whole)) * np.sign(slope if abs(slope) >= abs(whole) else whole)
    return Movement(float(fastest) * DB_PER_RELATIVE * rate_hz / pieces.hop)


def _jump(places: NDArray[np.intp], twisted: NDArray[np.bool_], level: Samples, hop: int) -> Jump:
    """Return the last run of disturbed places: place i is about the pieces i, i + 1 and i + 2."""
    breaks = np.flatnonzero(np.diff(places) > 2)
    first = int(places[breaks[-1] + 1]) if breaks.size else int(places[0])
    last = int(places[-1])
    change = float(level[last + 2] - level[first]) * DB_PER_RELATIVE
    return Jump(first * hop, (last + 3) * hop, change, bool(twisted[first : last + 1].any()))


def _middle(values: Samples) -> float:
    """Return the upper median: np.median spends ten times as long on short arrays."""
    half = values.size // 2
    return float(np.partition(values, half)[half])


@lru_cache(maxsize=64)
def _places(count: int) -> tuple[Samples, float]:
    """Return the centred places of pieces, and the sum of their squares."""
    places = np.arange(count, dtype=np.float64) - (count - 1) / 2.0
    return places, float(places @ places)


def _slope(level: Samples) -> tuple[float, float]:
    """Return the slope per piece of a straight line, and the standard uncertainty of the whole rise."""
    places, spread = _places(level.size)
    slope = float(places @ level) / spread
    left = level - slope * places
    left -= np.add.reduce(left) / level.size
    scatter = math.sqrt(float(left @ left) / max(1, level.size - 2))
    return slope, scatter * level.size / math.sqrt(spread)
