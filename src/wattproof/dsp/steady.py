"""The steady part of a recording: where the tone neither starts, ends, steps nor breaks."""

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.notes import Kind, Note, note
from wattproof.core.signal import Samples
from wattproof.core.units import DB_PER_RELATIVE
from wattproof.dsp.subblocks import SubBlocks, sub_blocks, width_for

_STEP = 0.004  # relative change of level, or phase in rad, from piece to piece that ends a steady part
_NOISE_FACTOR = 8.0  # such a change must also stand this far over the typical change
_KINK = 4e-4  # a smaller bend of the level over three pieces leaves less than −70 dB in the residual
_KINK_FACTOR = 12.0  # and this far over the typical bend stands no noise: eight standard deviations
_MARGIN_S = 0.05  # a tone that starts or ends within this of the recording's edge is neither late nor early
_FAINT = 0.03  # pieces below this share of the loudest are taken for silence


@attrs.frozen
class Steady:
    """The longest steady part: its first frame and length within what was searched, and what was left out."""

    first_frame: int
    frames: int
    notes: tuple[Note, ...] = ()


def _runs(joined: np.ndarray[tuple[int], np.dtype[np.bool_]]) -> list[tuple[int, int]]:
    """Return (first, last) piece of each run of pieces that are joined to the next; single pieces are runs too."""
    breaks = np.flatnonzero(~joined)
    firsts = np.concatenate([[0], breaks + 1])
    lasts = np.concatenate([breaks, [joined.size]])
    return [(int(first), int(last)) for first, last in zip(firsts, lasts, strict=True)]


def _allowed(changes: Samples) -> float:
    typical = float(np.median(np.abs(changes))) if changes.size else 0.0
    return max(_STEP, _NOISE_FACTOR * typical)


def _kinked(changes: Samples, joined: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Tell of each change whether the level kinks there: a step too small to be a jump, but not to spoil a reading."""
    kinks = np.abs(np.diff(changes))
    smooth = joined[1:] & joined[:-1]
    if not smooth.any():
        return np.zeros_like(joined)
    bent = smooth & (kinks > max(_KINK, _KINK_FACTOR * float(np.median(kinks[smooth]))))
    kinked = np.zeros_like(joined)
    kinked[:-1] = bent
    kinked[1:] |= bent
    return kinked


def _note_between(pieces: SubBlocks, before: bool, inside: int, outside: int) -> Note:  # noqa: FBT001
    """Say what ends the steady part between the pieces `inside` and `outside` it."""
    at_s = max(inside, outside) * pieces.hop / pieces.rate_hz
    level = pieces.level
    change = float(level[outside] - level[inside]) * (-1.0 if before else 1.0)
    silent = np.abs(pieces.amplitude[outside]) < _FAINT * np.abs(pieces.amplitude[inside])
    if silent:
        return note(Kind.STARTS_LATE if before else Kind.ENDS_EARLY, at_s=at_s)
    if abs(change) > _KINK:
        return note(Kind.LEVEL_STEP, at_s=at_s, db=change * DB_PER_RELATIVE)
    return note(Kind.BREAK, at_s=at_s)


def find_steady(samples: Samples, rate_hz: float, frequency_hz: float) -> Steady:
    """Return the longest steady part of samples, shape (frames,), that hold a tone near frequency_hz.

    A part ends where level or phase jump from one piece (10 ms or 4 cycles) to the next by more than 0.4 %, 0.004 rad
    or eight times what is typical, or where the level kinks by more than 0.04 % and twelve times what is typical. A
    recording shorter than a few pieces is taken as it stands.
    """
    width = width_for(frequency_hz, rate_hz)
    pieces = sub_blocks(samples, rate_hz, frequency_hz, width)
    count = pieces.amplitude.size
    if count < 4:
        return Steady(0, samples.size)
    strength = np.abs(pieces.amplitude)
    loud = strength > _FAINT * np.sort(strength)[-2]
    changes, turns = np.diff(pieces.level), pieces.turns
    both = loud[1:] & loud[:-1]
    if not both.any():
        return Steady(0, samples.size)
    drift = float(np.median(turns[both]))
    straight = np.abs(np.angle(np.exp(1j * (turns - drift))))
    joined = both & (np.abs(changes) <= _allowed(changes[both])) & (straight <= _allowed(straight[both]))
    joined &= ~_kinked(changes, joined)
    runs = [run for run in _runs(joined) if loud[run[0]]]
    first, last = max(runs, key=lambda run: (run[1] - run[0], float(strength[run[0]])))
    return _with_margins(pieces, first, last, samples.size)


def _with_margins(pieces: SubBlocks, first: int, last: int, frames: int) -> Steady:
    """Turn a run of pieces into frames, one piece in from whatever ended it, and say what that was."""
    count, hop, margin = pieces.amplitude.size, pieces.hop, round(_MARGIN_S * pieces.rate_hz)
    at_start, at_end = first == 0, last == count - 1
    begin = 0 if at_start else (first + 1) * hop
    end = frames if at_end else (last - 1) * hop + pieces.width
    if end - begin < pieces.width:
        begin, end = first * hop, min(frames, last * hop + pieces.width)
    notes = []
    if not at_start and begin > margin:
        notes.append(_note_between(pieces, before=True, inside=min(first + 1, last), outside=max(0, first - 3)))
    if not at_end and frames - end > margin:
        notes.append(_note_between(pieces, before=False, inside=max(first, last - 1), outside=min(count - 1, last + 3)))
    return Steady(begin, end - begin, tuple(notes))


def movement(samples: Samples, rate_hz: float, frequency_hz: float) -> tuple[float, float]:
    """Return how far level (relative) and phase (rad, less its straight line) range over samples, shape (frames,)."""
    pieces = sub_blocks(samples, rate_hz, frequency_hz, width_for(frequency_hz, rate_hz))
    if pieces.amplitude.size < 3:
        return 0.0, 0.0
    smooth = np.convolve(pieces.level, np.ones(3) / 3.0, mode="valid")
    phase = np.concatenate([[0.0], np.cumsum(pieces.turns)])
    place = np.arange(phase.size)
    straight = phase - np.polyval(np.polyfit(place, phase, 1), place)
    return float(np.ptp(smooth)), float(np.ptp(straight))
