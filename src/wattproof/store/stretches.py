"""Cuts what is captured into stretches that are stored once: blocks overlap, the file holds each frame one time."""

from collections.abc import Iterator, Sequence

import numpy as np

from wattproof.core.signal import Capture, Samples
from wattproof.store.session_values import Stretch


class Coverage:
    """Which frames of a run are stored already, as stretches in order without overlap."""

    def __init__(self, known: Sequence[Stretch] = ()) -> None:
        self._known: list[tuple[int, int]] = []
        for stretch in known:
            self.add(stretch)

    def add(self, stretch: Stretch) -> None:
        """Take a stretch that is stored now."""
        first, end = stretch.first_frame, stretch.end_frame
        apart = [(a, b) for a, b in self._known if b < first or a > end]
        touching = [(a, b) for a, b in self._known if not (b < first or a > end)]
        joined = (min([first, *(a for a, _ in touching)]), max([end, *(b for _, b in touching)]))
        self._known = sorted([*apart, joined])

    def missing(self, wanted: Stretch) -> Iterator[Stretch]:
        """Yield the parts of a stretch that are not stored, in order."""
        at = wanted.first_frame
        for first, end in self._known:
            if end <= at or first >= wanted.end_frame:
                continue
            if first > at:
                yield Stretch(at, first - at)
            at = max(at, end)
        if at < wanted.end_frame:
            yield Stretch(at, wanted.end_frame - at)


class Gathered:
    """Samples that are to be stored, joined where they follow on one another."""

    def __init__(self, coverage: Coverage) -> None:
        self._coverage = coverage
        self._parts: list[tuple[int, list[Samples]]] = []
        self._end: int | None = None

    def take(self, capture: Capture) -> None:
        """Take what of a capture is not stored yet."""
        for part in tuple(self._coverage.missing(Stretch(capture.first_frame, capture.frames))):
            start = part.first_frame - capture.first_frame
            samples = capture.samples[start : start + part.frames]
            if self._end == part.first_frame:
                self._parts[-1][1].append(samples)
            else:
                self._parts.append((part.first_frame, [samples]))
            self._end = part.end_frame
            self._coverage.add(part)

    def stretches(self) -> Iterator[tuple[int, Samples]]:
        """Yield the first frame of each stretch, and its samples."""
        for first_frame, parts in self._parts:
            yield first_frame, parts[0] if len(parts) == 1 else np.concatenate(parts)
