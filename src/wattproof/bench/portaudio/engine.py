"""What the callback does: obey, render, copy, log; it waits for nobody and keeps nothing that it is handed."""

import time
from collections.abc import Callable
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wattproof.bench.portaudio import layout
from wattproof.bench.portaudio.layout import Memory
from wattproof.bench.portaudio.synth import Synth

HELD_S = 0.3  # between two callbacks; a machine that was suspended must not go on to sound by itself
BEAT_LIMIT_S = 0.3  # the parent beats every 0.05 s; without a beat for so long it is taken for dead


def since_boot() -> float:
    """Return seconds on a clock that goes on while the machine is suspended, where the system has one."""
    boot = getattr(time, "CLOCK_BOOTTIME", None)  # Linux; elsewhere the clocks that there are go on, or nobody knows
    return time.perf_counter() if boot is None else time.clock_gettime(boot)


class StreamTimes(Protocol):
    """The times that PortAudio hands to a callback, in s."""

    inputBufferAdcTime: float  # noqa: N815 - PortAudio's own names
    outputBufferDacTime: float  # noqa: N815 - likewise
    currentTime: float  # noqa: N815 - likewise


class Engine:
    """The state of one stream. `run` is the callback; `end` may be called from any thread of the child."""

    def __init__(
        self,
        memory: Memory,
        rate_hz: float,
        channels: tuple[int, int],
        clock: Callable[[], float] = since_boot,
    ) -> None:
        self.why = ""  # why the stream is ending; empty while it goes on
        self._inputs, self._outputs = channels
        self._memory = memory
        self._words = memory.words
        self._ring = memory.ring
        self._ring_frames = memory.shape.ring_frames
        self._clock = clock
        self._synth = Synth(rate_hz, self._outputs, memory.marker)
        self._frame = 0
        self._rows = 0
        self._mutes = 0
        self._command = 0
        self._beat = -1
        self._beat_at = clock()
        self._last_block = False
        self._run_at: float | None = None

    def end(self, why: str) -> None:
        """Ramp down, then one silent block, then the end."""
        if not self.why:
            self.why = why

    def run(self, indata: NDArray[np.float32], outdata: NDArray[np.float32], times: StreamTimes, flags: int) -> bool:
        """Serve one callback; return True where the stream ends with this block, which then is silent.

        `indata` has shape (frames, inputs), `outdata` (frames, outputs); `flags` are those of `layout`. What may raise
        comes before the outputs are rendered, so that `run_down` can go on from the same sample.
        """
        now = self._clock()
        frames = len(indata)
        if self._run_at is not None and now - self._run_at > HELD_S:
            self.end("held")
        self._run_at = now
        self._obey(now)
        self._keep(indata, frames)
        self._log(frames, flags, now, times)
        self._words[layout.NEXT_FRAME] = self._frame
        self._synth.render(outdata)
        if self._synth.answered != self._words[layout.ANSWERED]:
            self._words[layout.ANSWER_FRAME] = self._synth.answer_frame
            self._words[layout.ANSWERED] = self._synth.answered
        return self._last_block

    def run_down(self, outdata: NDArray[np.float32], why: str) -> bool:
        """Serve a callback in which `run` raised: go on towards silence and capture nothing. Returns as `run` does."""
        self.end(why)
        self._synth.fade()
        self._last_block = self._synth.silent
        self._synth.render(outdata)
        return self._last_block

    def watch(self, now: float) -> None:
        """Look for a beat of the parent; without one for BEAT_LIMIT_S the stream ends. Any one thread may call it."""
        beat = self._words[layout.BEAT]
        if beat != self._beat:
            self._beat, self._beat_at = beat, now
        elif now - self._beat_at > BEAT_LIMIT_S:
            self.end("beat")

    def _obey(self, now: float) -> None:
        words, synth = self._words, self._synth
        self.watch(now)
        if words[layout.ENDING]:
            self.end("asked")
        mutes = words[layout.MUTES]
        if self.why or mutes != self._mutes:
            self._mutes = mutes
            synth.fade()
        command = words[layout.COMMAND]
        if command != self._command:
            self._command = command
            gains = [self._memory.gains[output] for output in range(self._outputs)]
            if words[layout.LATCHED] or self.why:
                gains = [0.0] * self._outputs
            if words[layout.KIND] == layout.MARKER:
                synth.sound_marker(command, words[layout.LENGTH], gains)
            else:
                synth.tone(command, words[layout.STEP], gains)
        self._last_block = bool(self.why) and synth.silent

    def _keep(self, indata: NDArray[np.float32], frames: int) -> None:
        slot = self._frame % self._ring_frames
        head = min(frames, self._ring_frames - slot)
        self._ring[slot : slot + head, : self._inputs] = indata[:head]
        if head < frames:
            self._ring[: frames - head, : self._inputs] = indata[head:]
        self._frame += frames

    def _log(self, frames: int, flags: int, now: float, times: StreamTimes) -> None:
        at = self._rows % layout.LOG_ROWS * layout.ROW
        log, clocks = self._memory.log, self._memory.times
        log[at] = self._frame - frames
        log[at + 1] = frames
        log[at + 2] = flags
        clocks[at] = now
        clocks[at + 1] = times.inputBufferAdcTime
        clocks[at + 2] = times.outputBufferDacTime
        clocks[at + 3] = times.currentTime
        self._rows += 1
        self._words[layout.ROWS] = self._rows
