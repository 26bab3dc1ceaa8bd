"""What parent and child share: one block of memory with words, a log row per callback, and the ring of samples."""

import secrets
from contextlib import suppress
from multiprocessing.shared_memory import SharedMemory
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

# Words that the parent writes.
BEAT = 0  # counts up while the parent lives
MUTES = 1  # counts the calls of mute, so that one between two callbacks is not missed
LATCHED = 2  # 1 while muted
ENDING = 3  # 1: ramp down and end
COMMAND = 4  # serial of the newest command, written after its words
KIND = 5  # TONE or MARKER
STEP = 6  # phase step per frame, in 2⁻⁶⁴ cycles
LENGTH = 7  # frames of the marker
# Words that the child writes.
NEXT_FRAME = 8  # the frame that is captured next, written after the samples
ROWS = 9  # log rows written so far, written after the row
ANSWERED = 10  # serial of the newest command obeyed, written after ANSWER_FRAME
ANSWER_FRAME = 11  # the output frame at which its ramp began
WORDS = 16

TONE, MARKER = 0, 1
MARKER_FRAMES = 1 << 21  # a sweep of 10 s at 192 kHz; pages that nothing is written to cost nothing
ROW = 4  # numbers per log row: first frame, frames, flags, spare; clock, input time, output time, stream time
LOG_ROWS = 32_768  # 10 s of callbacks of 64 frames at 192 kHz
RING_S = 5.4  # at least 5 s are promised; the rest is the margin that a reader keeps to the writer
MARGIN = 16  # a reader keeps ring / MARGIN frames away from the writer

# Flags of a log row: PortAudio's own bits (portaudio.h, PaStreamCallbackFlags).
INPUT_UNDERFLOW, INPUT_OVERFLOW, OUTPUT_UNDERFLOW, OUTPUT_OVERFLOW = 1, 2, 4, 8

_NAME = "wp-"  # macOS takes 30 characters at most, its leading slash included


class Shape(NamedTuple):
    """The sizes of one block; the parent decides them and tells the child."""

    ring_frames: int
    inputs: int
    outputs: int

    @property
    def offsets(self) -> tuple[int, int, int, int, int, int, int]:
        """Where words, gains, log numbers, log times, marker and ring begin, and the end, in bytes."""
        sizes = (WORDS * 8, self.outputs * 8, LOG_ROWS * ROW * 8, LOG_ROWS * ROW * 8, MARKER_FRAMES * 4)
        starts = [0]
        for size in (*sizes, self.ring_frames * self.inputs * 4):
            starts.append(starts[-1] + size)
        return (starts[0], starts[1], starts[2], starts[3], starts[4], starts[5], starts[6])


def shape_for(rate_hz: float, inputs: int, outputs: int) -> Shape:
    """Return the shape whose ring holds RING_S at a rate: a power of two of frames."""
    return Shape(1 << (round(RING_S * rate_hz) - 1).bit_length(), inputs, outputs)


class Memory:
    """One mapped block. Aligned 8-byte words are read and written whole; data are always written before their index.

    `words` and `log` hold int64, `gains` and `times` float64, `marker` and `ring` float32; `ring` has shape
    (ring_frames, inputs).
    """

    def __init__(self, block: SharedMemory, shape: Shape) -> None:
        self.shape = shape
        self._block = block
        start = shape.offsets
        view = memoryview(block.buf)  # type: ignore[arg-type]  # None only once it is closed
        self.words: memoryview[int] = view[start[0] : start[1]].cast("q")
        self.gains: memoryview[float] = view[start[1] : start[2]].cast("d")
        self.log: memoryview[int] = view[start[2] : start[3]].cast("q")
        self.times: memoryview[float] = view[start[3] : start[4]].cast("d")
        self.marker: NDArray[np.float32] = np.frombuffer(view, np.float32, MARKER_FRAMES, start[4])
        count = shape.ring_frames * shape.inputs
        flat: NDArray[np.float32] = np.frombuffer(view, np.float32, count, start[5])
        self.ring = flat.reshape(shape.ring_frames, shape.inputs)

    @property
    def name(self) -> str:
        """The name under which the other process finds the block."""
        return self._block.name

    def touch(self) -> None:
        """Write zeros to the ring and the log, so that no callback is the first to ask the system for a page."""
        self.ring.fill(0.0)
        np.frombuffer(self.log, np.int64).fill(0)
        np.frombuffer(self.times.cast("B"), np.float64).fill(0.0)

    def unlink(self) -> None:
        """Take the name away: the block lives until both processes let go, and is left behind by none."""
        self._block.unlink()

    def release(self) -> None:
        """Let go of the mapping. Nobody may use the block afterwards."""
        del self.marker, self.ring
        for view in (self.words, self.gains, self.log, self.times):
            view.release()
        with suppress(BufferError):  # a thread still looks at it: then the mapping goes with the process
            self._block.close()


def create(shape: Shape) -> Memory:
    """Map a new block of zeros under a name of its own (parent)."""
    return Memory(SharedMemory(_NAME + secrets.token_hex(8), create=True, size=shape.offsets[-1]), shape)


def attach(name: str, shape: Shape) -> Memory:
    """Map the block that the parent made (child)."""
    return Memory(SharedMemory(name), shape)
