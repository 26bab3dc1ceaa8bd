"""Holds the raw captures of a run, lead-in included, until the record that names them is kept."""

import math
from collections import deque
from threading import Event

import attrs
import numpy as np

from wattproof.bench.protocol import Bench
from wattproof.core.errors import BenchLostError, WattproofError
from wattproof.core.signal import Capture, Span

LEAD_IN_S = 0.5  # what a filter needs to settle before the block, so that it can be computed again from the file
HELD_S = 60.0  # a procedure names a block soon after it took it; more than this would be a leak


@attrs.frozen(eq=False, kw_only=True)
class RawCapture(Capture):
    """A block with its lead-in; `block` is the part of it that was acquired and read."""

    block: Span


class Held:
    """Raw captures in order, each with half a second before it where the bench still has that."""

    def __init__(self, bench: Bench, stop: Event) -> None:
        self._bench = bench
        self._stop = stop
        self._captures: deque[tuple[Span, RawCapture]] = deque()

    def hold(self, block: Capture) -> None:
        """Hold a block that was just acquired, with its lead-in."""
        self._captures.append((block.span, self._with_lead_in(block)))
        while len(self._captures) > 1 and sum(span.seconds for span, _ in self._captures) > HELD_S:
            self._captures.popleft()

    def release(self, span: Span) -> RawCapture:
        """Return the raw capture of a span and let go of the older ones; other channels may name the same span again.

        Raises:
            WattproofError: no such block is held.
        """
        for index, (held, capture) in enumerate(self._captures):
            if held.first_frame <= span.first_frame and span.end_frame <= held.end_frame:
                for _ in range(index):
                    self._captures.popleft()
                return capture
        raise WattproofError(f"the raw capture of frames {span.first_frame} to {span.end_frame} is no longer held")

    def _with_lead_in(self, block: Capture) -> RawCapture:
        lead = min(math.ceil(LEAD_IN_S * block.rate_hz), block.first_frame)
        if lead == 0:
            return _raw(block, block.span)
        try:
            before = self._bench.capture(block.first_frame - lead, lead, self._stop)
        except BenchLostError:  # overwritten already, or the bench began later: the block alone is still evidence
            return _raw(block, block.span)
        whole = Capture(
            np.concatenate([before.samples, block.samples]),
            block.rate_hz,
            before.first_frame,
            (*before.gaps, *(gap for gap in block.gaps if gap not in before.gaps)),
            (*before.overloads, *block.overloads),
        )
        return _raw(whole, block.span)


def _raw(capture: Capture, block: Span) -> RawCapture:
    fields = {name: getattr(capture, name) for name in ("samples", "rate_hz", "first_frame", "gaps", "overloads")}
    return RawCapture(**fields, block=block)
