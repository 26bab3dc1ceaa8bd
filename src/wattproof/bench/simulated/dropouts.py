"""Frames that get lost, repeated or replaced on their way, as on a real computer that is too late for its interface."""

from enum import StrEnum

import attrs
import numpy as np

from wattproof.bench.simulated.history import History
from wattproof.core import checks
from wattproof.core.signal import Gap, Samples


class Fault(StrEnum):
    """What happens to the frames at a drop-out."""

    LOST = "lost"  # they never come: what follows is later than it seems
    REPEATED = "repeated"  # the frames before come once more: what follows is earlier than it seems
    REPLACED = "replaced"  # they are zeros: what follows is in its place


@attrs.frozen
class DropOut:
    """One injected fault at an absolute captured frame. Unflagged, only the content shows it."""

    frame: int = attrs.field(validator=checks.not_negative)
    frames: int = attrs.field(validator=checks.positive)
    fault: Fault = Fault.LOST
    flagged: bool = True

    @property
    def shift(self) -> int:
        """By how many frames the fault moves what follows to a later captured frame."""
        return {Fault.LOST: -self.frames, Fault.REPEATED: self.frames, Fault.REPLACED: 0}[self.fault]

    @property
    def gap(self) -> Gap:
        """The gap as a driver would flag it; a loss has no length of its own, so its two neighbours bear it."""
        if self.fault is Fault.LOST:
            return Gap(max(self.frame - 1, 0), 2, f"{self.frames} frames lost (injected)")
        return Gap(self.frame, self.frames, f"{self.frames} frames {self.fault.value} (injected)")


class Delivery:
    """Brings converted frames into the history, with the injected faults, and knows which frame became which."""

    def __init__(self, dropouts: tuple[DropOut, ...], history: History) -> None:
        self._all = tuple(sorted(dropouts, key=lambda dropout: dropout.frame))
        self._history = history
        self._next = 0
        self._to_lose = 0
        self._to_replace = 0

    def delivered(self, converted_frame: int) -> int:
        """Return the captured frame at which a converted frame arrives (a lost one: where its follower does)."""
        shift = 0
        for dropout in self._all:
            at = dropout.frame - shift
            if converted_frame < at:
                break
            if dropout.fault is Fault.LOST and converted_frame < at + dropout.frames:
                return dropout.frame
            shift += dropout.shift
        return converted_frame + shift

    def gaps(self, first_frame: int, frames: int) -> tuple[Gap, ...]:
        """Return the flagged gaps that touch a stretch of captured frames."""
        flagged = (dropout.gap for dropout in self._all if dropout.flagged)
        end = first_frame + frames
        return tuple(gap for gap in flagged if gap.first_frame < end and gap.first_frame + gap.frames > first_frame)

    def push(self, samples: Samples) -> None:
        """Take the next converted frames, shape (frames, channels)."""
        while samples.shape[0]:
            if self._to_lose:
                dropped = min(self._to_lose, samples.shape[0])
                self._to_lose -= dropped
                samples = samples[dropped:]
                continue
            until = self._frames_to_fault()
            if until == 0:
                self._begin(self._all[self._next])
                continue
            part = samples[:until]
            self._history.append(self._replaced(part))
            samples = samples[part.shape[0] :]

    def _frames_to_fault(self) -> int | None:
        if self._next == len(self._all):
            return None
        return max(self._all[self._next].frame - self._history.end, 0)

    def _begin(self, dropout: DropOut) -> None:
        self._next += 1
        if dropout.fault is Fault.LOST:
            self._to_lose += dropout.frames
        elif dropout.fault is Fault.REPLACED:
            self._to_replace = dropout.frames
        else:
            first = max(dropout.frame - dropout.frames, self._history.oldest)
            before = self._history.read(first, self._history.end - first)
            rows = np.arange(dropout.frames) % max(before.shape[0], 1)
            self._history.append(before[rows] if before.shape[0] else np.zeros((dropout.frames, before.shape[1])))

    def _replaced(self, samples: Samples) -> Samples:
        count = min(self._to_replace, samples.shape[0])
        if not count:
            return samples
        self._to_replace -= count
        samples = samples.copy()
        samples[:count] = 0.0
        return samples
