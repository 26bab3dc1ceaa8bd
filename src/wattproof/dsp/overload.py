"""Whether a capture was overloaded: runs at full scale that no sine within full scale could make."""

import math
from collections.abc import Iterable

from wattproof.core.notes import Kind, Note, note
from wattproof.core.signal import Overload, Span
from wattproof.core.units import db

_TOP = 1.5 / 32768.0  # how near to the top a 16-bit converter cannot tell from full scale: one and a half steps
_SPARE_DB = 1.0  # room added to what would just fit


def longest_fair_run(frequency_hz: float, rate_hz: float) -> int:
    """Return how many frames in a row a full-scale sine may stay at full scale: 2·acos(1 − δ)/ω, and one more."""
    return 1 + math.ceil(2.0 * math.acos(1.0 - _TOP) * rate_hz / (2.0 * math.pi * frequency_hz))


def judge_overload(
    overloads: Iterable[Overload], channel: int, span: Span, frequency_hz: float | None, lowest_hz: float = 20.0
) -> Note | None:
    """Return what to say of an overloaded channel, or None where no run in span is longer than a sine can make.

    Without a known frequency the run allowed is that of the lowest one.
    """
    lengths = [
        min(run.first_frame + run.frames, span.end_frame) - max(run.first_frame, span.first_frame)
        for run in overloads
        if run.channel == channel
    ]
    if not lengths:
        return None
    fair = longest_fair_run(frequency_hz or lowest_hz, span.rate_hz)
    unfair = [length for length in lengths if length > fair]
    if not unfair:
        return None
    share = min(1.0, sum(length for length in lengths if length > 0) / span.frames)
    overdrive = 1.0 / max(math.sin(math.pi / 2.0 * (1.0 - share)), 1e-3)
    add_db = math.ceil(db(overdrive) + _SPARE_DB)
    return note(Kind.OVERLOADED, percent=100.0 * share, longest_frames=max(unfair), add_db=add_db)
