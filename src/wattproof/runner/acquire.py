"""Cuts blocks from what the bench captures; refuses those that a change of level or a break in the content spoils."""

import math
import threading
from collections import deque
from collections.abc import Callable

import attrs

from wattproof.bench.protocol import Bench
from wattproof.core.errors import StoppedError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.signal import Capture, Tone
from wattproof.procedures.requests import Acquire
from wattproof.runner.content import ContentWitness, Stretch

LONGEST_LAG_S = 1.0  # a bench keeps at least 5 s; a procedure this far behind is brought back to the present
CHANGE_LEAD_S = 0.010  # a silence from another thread may show this much before it was noted
CHANGE_SETTLE_S = 0.3  # common practice, no source: ramp and round trip, also through a desktop's mixer


@attrs.frozen
class _Hole:
    """A stretch that no block may touch."""

    first_frame: int
    end_frame: int
    note: Note

    def touches(self, first_frame: int, end_frame: int) -> bool:
        return self.first_frame < end_frame and first_frame < self.end_frame


class Blocks:
    """Answers `Acquire` with one block after the other. `refuse` is told of every block that was not fit to be read."""

    def __init__(self, bench: Bench, stop: threading.Event, refuse: Callable[[Note], None]) -> None:
        self._bench = bench
        self._rate_hz = bench.identity.rate_hz
        self._stop = stop
        self._refuse = refuse
        self._changes: deque[_Hole] = deque(maxlen=64)
        self.content = ContentWitness(bench, stop)
        self._stands: int | None = None
        self._last: tuple[int, int] | None = None

    def tone_stands(self, first_frame: int, tone: Tone | None = None) -> None:
        """Say that the procedure changed the tone, and that it stands from an absolute frame on.

        A tone that is named is followed, so that its content proves or clears lost frames.
        """
        self._stands = first_frame
        self.content.follow(tone, first_frame)

    def level_changed(self) -> None:
        """Say that the level changed just now and not through the procedure. May be called from any thread."""
        self.content.lose()
        now = self._bench.next_frame
        lead, settle = self._frames(CHANGE_LEAD_S), self._frames(CHANGE_SETTLE_S)
        step = note(Kind.LEVEL_STEP, db=-math.inf, at_s=now / self._rate_hz)  # to silence
        self._changes.append(_Hole(now - lead, now + settle, step))

    def acquire(self, request: Acquire) -> Capture:
        """Return the next block that is fit to be read; what is not is refused, and the next one tried.

        An overloaded block is delivered: its reading says so.

        Raises:
            StoppedError: stopped while waiting.
            BenchLostError: the bench no longer delivers.
        """
        first = self._first_frame(request)
        while True:
            if self._stop.is_set():
                raise StoppedError("")
            first = self._caught_up(first, request.frames)
            try:
                capture = self._bench.capture(first, request.frames, self._stop)
                hole = self._hole_in(capture)
            except StoppedError as stopped:
                raise StoppedError("") from stopped  # whoever stopped it knows why
            if hole is None:
                self._stands = None
                self._last = (capture.first_frame, capture.span.end_frame)
                return attrs.evolve(capture, gaps=())  # whatever was suspected is cleared by its content
            self._refuse(hole.note)
            first = max(hole.end_frame, first + 1)

    def _first_frame(self, request: Acquire) -> int:
        if self._stands is not None:
            first = self._stands + math.ceil(request.settle_s * self._rate_hz)
        elif self._last is None:
            first = self._bench.next_frame
        else:
            start, end = self._last
            first = end if request.hop is None else start + request.hop
        return max(first, self._bench.next_frame) if request.renew else max(first, 0)

    def _caught_up(self, first: int, frames: int) -> int:
        newest = self._bench.next_frame
        behind = newest - (first + frames)
        if behind <= self._frames(LONGEST_LAG_S):
            return first
        self._refuse(note(Kind.GAP, at_s=first / self._rate_hz, why="the reading fell behind the capture"))
        return newest

    def _hole_in(self, capture: Capture) -> _Hole | None:
        first, end = capture.first_frame, capture.span.end_frame
        changes = [hole for hole in tuple(self._changes) if hole.touches(first, end)]
        if changes:
            return max(changes, key=lambda hole: hole.end_frame)
        spoilt = [self._hole_of(stretch) for stretch in self.content.spoilt(capture)]
        for hole in spoilt:
            if not hole.touches(first, end):  # too small a step to be seen before more had come: it is told at least
                self._refuse(hole.note)
        touching = [hole for hole in spoilt if hole.touches(first, end)]
        return max(touching, key=lambda hole: hole.end_frame, default=None)

    def _hole_of(self, stretch: Stretch) -> _Hole:
        at_s = stretch.first_frame / self._rate_hz
        return _Hole(stretch.first_frame, stretch.end_frame, note(Kind.GAP, at_s=at_s, why=stretch.why))

    def _frames(self, seconds: float) -> int:
        return math.ceil(seconds * self._rate_hz)
