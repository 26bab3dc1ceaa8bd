"""Reads the ring by absolute frame: what is there is copied, and what was overwritten meanwhile is never handed on."""

from wattproof.bench.portaudio import layout
from wattproof.bench.portaudio.layout import Memory
from wattproof.core.signal import Samples


class OverwrittenError(Exception):
    """The frame is not held any more, or never was. `oldest` is the oldest that is."""

    def __init__(self, oldest: int) -> None:
        super().__init__(f"the oldest frame held is {oldest}")
        self.oldest = oldest


def read(memory: Memory, first_frame: int, into: Samples) -> int:
    """Copy what has been captured from first_frame on into `into`, shape (frames, channels); return how many frames.

    The index is looked at before the copy, for what is there, and after it, for what may have been written over.

    Raises:
        OverwrittenError: first_frame is older than the ring.
    """
    size = memory.shape.ring_frames
    if memory.words[layout.NEXT_FRAME] - first_frame > size:
        raise OverwrittenError(max(0, memory.words[layout.NEXT_FRAME] - size + size // layout.MARGIN))
    count = max(0, min(memory.words[layout.NEXT_FRAME] - first_frame, len(into)))
    if first_frame >= 0 and count:
        slot = first_frame % size
        head = min(count, size - slot)
        into[:head] = memory.ring[slot : slot + head, : into.shape[1]]
        into[head:count] = memory.ring[: count - head, : into.shape[1]]
    oldest = max(0, memory.words[layout.NEXT_FRAME] - size + size // layout.MARGIN)
    if first_frame < oldest:
        raise OverwrittenError(oldest)
    return count
