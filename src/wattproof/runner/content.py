"""Follows the tone through the live capture and says, by its content alone, which suspect stretches are sound."""

import math
import threading
from collections import deque

import attrs
import numpy as np

from wattproof.bench.protocol import Bench
from wattproof.core.errors import BenchLostError
from wattproof.core.signal import Capture, Gap, Samples, Sweep, Tone
from wattproof.dsp.continuity import NEAR, Break, Continuity, Verdict, zeros

LOOK_S = 0.5  # how far back a break is still looked for: frames to both sides of it make small steps plain
AFTER_S = (0.06, 0.12, 0.25, 0.5)  # waited for behind a suspect stretch, while its content says neither yes nor no
AHEAD_PIECES, AHEAD_S = 4, 0.025  # looked at behind a block, the shorter of the two
BRIDGED_S = 1.0  # frames between two blocks that are fetched, so that the tone is followed through them
_WORDS = {"flag": "the sound system flagged a late callback", "clock": "the clock and the count of frames disagree"}


def gap_words(gap: Gap) -> str:
    """Return in words who raised the suspicion."""
    return _WORDS.get(gap.why, gap.why)


def break_words(found: Break) -> str:
    """Return in words what the content shows."""
    if found.step_rad:
        return f"the tone's phase steps by {abs(found.step_rad) * 1e3:.3g} mrad"
    return "the tone is broken in its content"


@attrs.frozen
class Stretch:
    """Frames from first_frame to before end_frame that are not to be read, and why; `proven` where content shows it."""

    first_frame: int
    end_frame: int
    why: str
    proven: bool


class ContentWitness:
    """Judges block after block. The run's thread calls it; only `lose` may be called from any thread."""

    def __init__(self, bench: Bench, stop: threading.Event) -> None:
        self._bench = bench
        self._stop = stop
        self._rate_hz = bench.identity.rate_hz
        self._followed: Continuity | None = None
        self._cleared: deque[tuple[int, int]] = deque(maxlen=256)
        self._spoilt: deque[Stretch] = deque(maxlen=256)
        self.cleared = 0  # suspect stretches that content cleared

    def follow(self, tone: Tone | None, first_frame: int) -> None:
        """Follow a tone that stands from first_frame on; None, silence or a sweep: there is nothing to follow."""
        steady = tone is not None and tone.level_fs > 0.0 and not isinstance(tone, Sweep)
        followed = None
        if tone is not None and steady:
            followed = Continuity(self._rate_hz, tone.frequency_hz)
            followed.pieces.restart(first_frame)
        self._followed = followed

    def lose(self) -> None:
        """Follow nothing any more: the tone was silenced."""
        self._followed = None

    def spoilt(self, capture: Capture) -> tuple[Stretch, ...]:
        """Return what is not to be read in or before a block: what content proves, and what it could not clear.

        Waits for more frames where a suspect stretch cannot be judged yet.

        Raises:
            StoppedError: stopped while waiting.
        """
        followed = self._followed
        known = [stretch for stretch in self._spoilt if _touch(stretch, capture)]
        new = [self._judged(followed, gap) for gap in capture.gaps if not self._is_known(gap)]
        unsuspected = None if followed is None else self._take(followed, capture)
        if unsuspected is not None:
            new.append(self._proven(followed, unsuspected, unsuspected.first_frame, 0))
        told = [stretch for stretch in new if stretch is not None]
        self._spoilt.extend(told)
        return (*known, *told)

    def _is_known(self, gap: Gap) -> bool:
        first, end = gap.first_frame, gap.first_frame + max(gap.frames, 1)
        spoilt = ((stretch.first_frame, stretch.end_frame) for stretch in self._spoilt)
        return any(low <= first and end <= high for low, high in (*self._cleared, *spoilt))

    def _judged(self, followed: Continuity | None, gap: Gap) -> Stretch | None:
        """Prove or clear a suspect stretch; what remains undecided is spoilt."""
        first, end = gap.first_frame, gap.first_frame + max(gap.frames, 1)
        verdict = Verdict() if followed is None else self._verdict(followed, first, end)
        if verdict.clear:
            self.cleared += 1
            self._cleared.append((first, end))
            return None
        if verdict.found is None:
            if followed is not None and followed.pieces.origin < end:
                followed.pieces.restart(end)
            return Stretch(first, end, gap_words(gap), proven=False)
        return self._proven(followed, verdict.found, first, end)

    def _verdict(self, followed: Continuity, first: int, end: int) -> Verdict:
        least = (NEAR + 3) * followed.pieces.hop
        if first - followed.pieces.origin < least:
            return Verdict()
        verdict = Verdict()
        for after_s in AFTER_S:
            wanted = end + max(math.ceil(after_s * self._rate_hz), least)
            missing = wanted - followed.pieces.end
            if missing > 0:
                try:
                    more = self._bench.capture(followed.pieces.end, missing, self._stop)
                except BenchLostError:
                    break
                followed.pieces.take(more.samples)
            verdict = followed.judge(first, end)
            if verdict.clear or verdict.found is not None:
                break
        return verdict

    def _proven(self, followed: Continuity | None, found: Break, first: int, end: int) -> Stretch:
        broken = Stretch(min(first, found.first_frame), max(end, found.first_frame + found.frames), "", proven=True)
        if followed is not None:
            followed.pieces.restart(broken.end_frame)
        return attrs.evolve(broken, why=break_words(found))

    def _take(self, followed: Continuity, capture: Capture) -> Break | None:
        """Follow the tone through what is new of a block, and return the break in it that nobody suspected."""
        pieces = followed.pieces
        hole = capture.first_frame - pieces.end
        if hole > 0 and not self._bridge(followed, hole):
            pieces.restart(capture.first_frame)
        new = capture.samples[pieces.end - capture.first_frame :] if pieces.end < capture.span.end_frame else None
        if new is None:
            return None
        first = pieces.end
        pieces.take(new)
        new = self._ahead(followed, new)
        silent = zeros(new) if followed.hears else None
        if silent is not None:
            return Break(first + silent[0], silent[1], 0.0)
        return self._look(followed, followed.pieces.end)

    def _ahead(self, followed: Continuity, new: Samples) -> Samples:
        """Take a little more than the block, so that its end is seen too: a large step there would be read as noise."""
        frames = min(AHEAD_PIECES * followed.pieces.hop, math.ceil(AHEAD_S * self._rate_hz))
        try:
            more = self._bench.capture(followed.pieces.end, frames, self._stop)
        except BenchLostError:
            return new
        followed.pieces.take(more.samples)
        return np.concatenate([new, more.samples])

    def _look(self, followed: Continuity, end: int) -> Break | None:
        """Look for a break that nobody suspected."""
        first = max(end - math.ceil(LOOK_S * self._rate_hz), followed.pieces.origin)
        return followed.look(first, end).found

    def _bridge(self, followed: Continuity, frames: int) -> bool:
        pieces = followed.pieces
        if pieces.end == pieces.origin or frames > BRIDGED_S * self._rate_hz:
            return False
        try:
            between = self._bench.capture(pieces.end, frames, self._stop)
        except BenchLostError:
            return False
        if any(not self._is_known(gap) for gap in between.gaps):
            return False
        pieces.take(between.samples)
        return True


def _touch(stretch: Stretch, capture: Capture) -> bool:
    return stretch.first_frame < capture.span.end_frame and capture.first_frame < stretch.end_frame
