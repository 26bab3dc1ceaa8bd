"""The parent's thread beside a stream: beats, reads the log, and notices when the bench is lost."""

import threading
import time

import numpy as np
from numpy.typing import NDArray

from wattproof.bench.portaudio import layout
from wattproof.bench.portaudio.gaps import GapFinder, Row
from wattproof.bench.portaudio.layout import Memory
from wattproof.bench.portaudio.process import Child
from wattproof.core.signal import Gap

BEAT_S = 0.05
STILL_S = 0.3  # without a callback for so long the device is lost
ZERO_S = 0.1  # exact zeros for so long, where a tone had come back, are no signal: the device is gone
END_S = 0.5  # a child whose device is lost gets so long to end by itself

_REASONS = {
    "beat": "it had no sign of life from this program for 0.3 s (the machine was suspended or held)",
    "held": "the sound system stood still for more than 0.3 s (the machine was suspended or held)",
    "inactive": "the audio server or the interface stopped the stream",
    "finished": "the audio server or the interface stopped the stream",
    "term": "its process was ended from outside",
    "parent": "its process was cut off from this program",
}
_WAY_OUT = "look at the cable and the audio server, then connect again"


class ZeroWatch:
    """Notices that a tone which came back has turned into exact zeros."""

    def __init__(self, rate_hz: float) -> None:
        self._limit = round(ZERO_S * rate_hz)
        self._from: int | None = None
        self._heard: int | None = None  # the frame after the last sample that was not zero, since the tone stands

    def sound(self, from_frame: int, *, changed: bool) -> None:
        """A tone stands from from_frame on; `changed`: on other outputs than before, or after silence."""
        if changed or self._from is None:
            self._from, self._heard = from_frame, None

    def silence(self) -> None:
        """Nothing sounds: zeros mean nothing."""
        self._from = None

    def look(self, first_frame: int, block: NDArray[np.float32]) -> bool:
        """Take the next samples, shape (frames, inputs); return True where the tone has turned into zeros."""
        begin = self._from
        if begin is None or first_frame + len(block) <= begin:
            return False
        block = block[max(0, begin - first_frame) :]
        first_frame = max(first_frame, begin)
        alive = np.flatnonzero(block.any(axis=1))
        if alive.size:
            self._heard = first_frame + int(alive[-1]) + 1
        return self._heard is not None and first_frame + len(block) - self._heard >= self._limit


class Lookout:
    """Watches one stream until it is told to rest. `lost` is the sentence on a lost bench, empty while it lives."""

    def __init__(self, name: str, memory: Memory, child: Child, rate_hz: float, echo_frames: int) -> None:
        self.lost = ""
        self.zeros = ZeroWatch(rate_hz)
        self._name = name
        self._memory = memory
        self._child = child
        self._gaps = GapFinder(rate_hz, echo_frames)
        self._rows = self._row_end = 0
        self._seen = 0
        self._still_since: float | None = None
        self._running = False
        self._rest = threading.Event()
        self._lock = threading.Lock()
        self._thread = threading.Thread(target=self._run, name="portaudio lookout", daemon=True)

    def start(self) -> None:
        """Begin to beat: the child lives by it."""
        self._thread.start()

    def watch(self) -> None:
        """Begin to look for a loss too: the stream runs."""
        self._running = True

    def ignore(self) -> None:
        """Look for no loss any more: the stream is being ended. The beat goes on."""
        self._running = False

    def rest(self) -> None:
        """End the thread."""
        self._rest.set()
        self._thread.join(layout.RING_S)

    def echo(self, frames: int) -> None:
        """Tell the round trip once it is measured."""
        self._gaps.echo_frames = frames

    def gaps(self, first_frame: int, frames: int) -> tuple[Gap, ...]:
        """Return the suspect stretches that touch a stretch, by all that the log says up to now."""
        with self._lock:
            self._read_log()
            return self._gaps.touching(first_frame, frames)

    def _run(self) -> None:
        try:
            self._beat()
        except Exception as error:
            self.lost = f"{self._name}: the lookout failed ({error}); close and connect again"  # nobody waits for ever
            raise

    def _beat(self) -> None:
        words = self._memory.words
        while not self._rest.wait(BEAT_S):
            words[layout.BEAT] += 1
            with self._lock:
                self._read_log()
            if self._running and not self.lost:
                sentence = self._look(time.monotonic())
                if sentence and self._running:
                    self.lost = f"{self._name}: {sentence}; {_WAY_OUT}"
                    words[layout.ENDING] = 1
                    self._child.end(END_S)

    def _look(self, now: float) -> str:
        """Return why the bench is lost, or nothing."""
        message = self._child.hear(0.0)
        if message is not None and message["event"] == "ended":
            return _REASONS.get(message["why"], f"its process ended ({message['why']})")
        if self._child.gone:
            return "its process ended without a word"
        frame = self._memory.words[layout.NEXT_FRAME]
        if frame == self._seen:
            if self._still_since is None:
                self._still_since = now
            return "no samples came for 0.3 s" if now - self._still_since >= STILL_S else ""
        self._still_since = None
        first, self._seen = max(self._seen, frame - self._memory.shape.ring_frames // 2), frame
        return "the returning tone turned into exact zeros" if self._zeros(first, frame) else ""

    def _zeros(self, first_frame: int, end_frame: int) -> bool:
        ring, size = self._memory.ring, self._memory.shape.ring_frames
        slot = first_frame % size
        head = min(end_frame - first_frame, size - slot)
        lost = self.zeros.look(first_frame, ring[slot : slot + head])
        if first_frame + head < end_frame:
            lost = self.zeros.look(first_frame + head, ring[: end_frame - first_frame - head])
        return lost

    def _read_log(self) -> None:
        log, times = self._memory.log, self._memory.times
        rows = self._memory.words[layout.ROWS]
        oldest = rows - layout.LOG_ROWS * (layout.MARGIN - 1) // layout.MARGIN
        if self._rows < oldest:
            first_kept = log[oldest % layout.LOG_ROWS * layout.ROW]
            self._gaps.miss(self._row_end, first_kept - self._row_end)
            self._rows = oldest
        for row in range(self._rows, rows):
            at = row % layout.LOG_ROWS * layout.ROW
            self._gaps.look(Row(log[at], log[at + 1], log[at + 2], times[at]))
            self._row_end = log[at] + log[at + 1]
        self._rows = rows
        self._gaps.forget(self._row_end - 2 * self._memory.shape.ring_frames)
