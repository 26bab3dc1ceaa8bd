"""Witnesses of lost frames that the log of callbacks can give: its flags, and the wall clock against the frames.

Neither proves a loss nor clears one (that is for the content); each makes a stretch suspect.
"""

from collections import deque

import attrs

from wattproof.core.signal import Gap

SLACK_S = 0.002  # lateness beyond the usual that makes a callback suspect; a period of 256 at 96 kHz lasts 2.7 ms
LEARN_S = 0.5  # after a start or a loss, what is usual is learnt anew
BUCKET_S, BUCKETS = 0.1, 10  # what is usual is judged over the last second
CONFIRM_S = 1.0  # lateness that lasts so long is no late callback: the frames are missing


@attrs.frozen
class Row:
    """One callback as logged: its first frame, its frames, PortAudio's flags and the wall clock at its start."""

    first_frame: int
    frames: int
    flags: int
    clock_s: float


class ClockWitness:
    """Holds the wall clock against the frames counted.

    The offset clock − frames/rate of punctual callbacks stays put but for the drift between two crystals. Lateness
    that later callbacks make good was a busy machine; lateness that stays means frames that never came, an offset that
    drops below the usual means frames that came twice.
    """

    def __init__(self, rate_hz: float) -> None:
        self._rate_hz = rate_hz
        self._buckets: deque[tuple[float, float, float]] = deque(maxlen=BUCKETS)  # start, lowest, highest offset
        self._begun_s: float | None = None
        self._doubt: Gap | None = None
        self._doubt_s = 0.0
        self._doubt_low = self._doubt_high = 0.0

    @property
    def doubt(self) -> Gap | None:
        """The stretch that is suspect until a punctual callback clears it."""
        return self._doubt

    def look(self, row: Row, before: Row) -> Gap | None:
        """Take the next row and the one before it; return a gap that has become certain enough to be kept."""
        offset = row.clock_s - row.first_frame / self._rate_hz
        if self._begun_s is None:
            self._begun_s = row.clock_s
        learning = row.clock_s - self._begun_s < LEARN_S
        if learning or not self._buckets:
            self._learn(row.clock_s, offset, offset)
            return None
        low = min(bucket[1] for bucket in self._buckets)
        high = max(bucket[2] for bucket in self._buckets)
        if offset < low - SLACK_S:
            self._restart(row.clock_s, offset, offset)
            return _between(before, row)
        if offset <= high + SLACK_S:
            self._doubt = None
            self._learn(row.clock_s, offset, offset)
            return None
        return self._late(row, before, offset)

    def _late(self, row: Row, before: Row, offset: float) -> Gap | None:
        if self._doubt is None:
            self._doubt, self._doubt_s = _between(before, row), row.clock_s
            self._doubt_low = self._doubt_high = offset
        self._doubt_low = min(self._doubt_low, offset)
        self._doubt_high = max(self._doubt_high, offset)
        if row.clock_s - self._doubt_s < CONFIRM_S:
            return None
        certain = self._doubt
        self._restart(row.clock_s, self._doubt_low, self._doubt_high)
        return certain

    def _restart(self, clock_s: float, low: float, high: float) -> None:
        self._buckets.clear()
        self._begun_s = clock_s
        self._doubt = None
        self._learn(clock_s, low, high)

    def _learn(self, clock_s: float, low: float, high: float) -> None:
        if self._buckets and clock_s - self._buckets[-1][0] < BUCKET_S:
            start, least, most = self._buckets[-1]
            self._buckets[-1] = (start, min(least, low), max(most, high))
        else:
            self._buckets.append((clock_s, low, high))


class GapFinder:
    """Collects what the witnesses say, row by row.

    A flagged callback makes suspect what came from the callback before it to its own end, and `echo_frames` more: a
    hole in what was played comes back later by the round trip.
    """

    def __init__(self, rate_hz: float, echo_frames: int) -> None:
        self.echo_frames = echo_frames
        self._clock = ClockWitness(rate_hz)
        self._before: Row | None = None
        self._kept: deque[Gap] = deque()

    def look(self, row: Row) -> None:
        """Take the next row of the log."""
        before, self._before = self._before or row, row
        if row.flags:
            end = row.first_frame + row.frames + self.echo_frames
            self._keep(Gap(before.first_frame, end - before.first_frame, "flag"))
        certain = self._clock.look(row, before)
        if certain is not None:
            self._keep(certain)

    def miss(self, first_frame: int, frames: int) -> None:
        """Take note of frames whose log rows were overwritten before they were read: nothing is known of them."""
        self._keep(Gap(first_frame, frames, "flag"))

    def touching(self, first_frame: int, frames: int) -> tuple[Gap, ...]:
        """Return the gaps that share a frame with a stretch."""
        doubt = self._clock.doubt
        found = [*self._kept, doubt] if doubt is not None else [*self._kept]
        end = first_frame + frames
        return tuple(gap for gap in found if gap.first_frame < end and first_frame < gap.first_frame + gap.frames)

    def forget(self, before_frame: int) -> None:
        """Drop the gaps that end before a frame that nobody can ask for any more."""
        while self._kept and self._kept[0].first_frame + self._kept[0].frames <= before_frame:
            self._kept.popleft()

    def _keep(self, gap: Gap) -> None:
        if self._kept and self._kept[-1].why == gap.why:
            last = self._kept[-1]
            end = max(last.first_frame + last.frames, gap.first_frame + gap.frames)
            if last.first_frame <= gap.first_frame <= last.first_frame + last.frames:
                self._kept[-1] = Gap(last.first_frame, end - last.first_frame, gap.why)
                return
        self._kept.append(gap)


def _between(before: Row, row: Row) -> Gap:
    """The stretch around the border of two callbacks, where frames are missing or double."""
    return Gap(before.first_frame, row.first_frame + row.frames - before.first_frame, "clock")
