"""A recording played as if it were live: captured once, captured again, at its own pace or as fast as asked."""

import time
from collections.abc import Callable
from pathlib import Path
from threading import Event, Lock
from typing import Any, BinaryIO, Literal

from wattproof.bench.protocol import Control, Identity
from wattproof.bench.rails import integer_rails, rail_runs
from wattproof.bench.recording.decoder import INTEGER_BITS, Source
from wattproof.bench.recording.sound_file import open_sound, opened, printable
from wattproof.core.calibration import Calibration
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.signal import Capture, Tone

LONGEST_WAIT_S = 0.25
GLANCE_S = 0.1  # how much is read while opening, to find a file that can't be read


class RecordingBench:
    """Captures from a sound file; frame 0 is the file's first. It sounds nothing and has no controls."""

    def __init__(
        self, path: str | Path, pace: Literal["real", "free"] = "real", clock: Callable[[], float] = time.monotonic
    ) -> None:
        self._path, self._real, self._clock = str(path), pace == "real", clock
        self._name = printable(path)
        about = open_sound(path, seconds=GLANCE_S)
        self._rate_hz, self._channels, self._frames = about.rate_hz, about.channels, about.frames
        self._rails = integer_rails(INTEGER_BITS[about.subtype]) if about.subtype in INTEGER_BITS else (-1.0, 1.0)
        self._lock = Lock()  # one reader at a time: the file has one position
        self._sound: Any = None
        self._file: BinaryIO
        self._opened_s: float | None = None
        self._asked = 0

    @property
    def identity(self) -> Identity:
        """What this bench is: the file, its rate and channels; it has no outputs."""
        return Identity(self._name, self._rate_hz, self._channels, 0, real=False)

    @property
    def calibration(self) -> Calibration:
        """Nothing: a sound file does not tell what its full scale was."""
        return Calibration()

    def open(self) -> None:
        """Start at the file's first frame.

        Raises:
            WrongUseError: the file cannot be read, or it was opened before.
        """
        import soundfile  # noqa: PLC0415 - only where a recording is played

        if self._opened_s is not None:
            raise WrongUseError(f"{self._name}: it was opened before; make a new bench")
        self._file = opened(self._path)
        try:
            self._sound = soundfile.SoundFile(Source(self._file))
        except soundfile.SoundFileError:
            self._file.close()
            raise WrongUseError(f"{self._name}: it is no readable sound file any more; record it again") from None
        self._opened_s = self._clock()

    def close(self) -> None:
        """Let go of the file."""
        with self._lock:
            if self._sound is not None:
                self._sound.close()
                self._file.close()
                self._sound = None

    def play(self, tone: Tone) -> int:  # noqa: ARG002 - a recording sounds what it holds
        """Sound nothing, and return the frame that is captured next."""
        return self.next_frame

    def capture(self, first_frame: int, frames: int, stop: Event) -> Capture:
        """Wait for the frames and return them, with the runs at the format's full scale inside them.

        Raises:
            StoppedError: `stop` was set.
            BenchLostError: not open, or the recording ends before.
        """
        end = first_frame + frames
        if end > self._frames:
            raise BenchLostError(f"the recording ended after {self._frames / self._rate_hz:.2f} s ({self._name})")
        self._wait_for(end, stop)
        with self._lock:
            if self._sound is None:
                raise BenchLostError(f"the recording is not open ({self._name})")
            samples = self._read(first_frame, frames)
            self._asked = max(self._asked, end)
        overloads = rail_runs(samples, *self._rails, first_frame=first_frame)
        return Capture(samples, self._rate_hz, first_frame, (), overloads)

    @property
    def next_frame(self) -> int:
        """The frame that is captured next: by the clock, or after the last one asked for."""
        if self._real and self._opened_s is not None:
            return int((self._clock() - self._opened_s) * self._rate_hz)
        return self._asked

    def mute(self) -> None:
        """Do nothing: nothing sounds."""

    def release(self) -> None:
        """Do nothing: nothing was muted."""

    @property
    def controls(self) -> tuple[Control, ...]:
        """None."""
        return ()

    def turn(self, name: str, value: float) -> None:
        """Refuse.

        Raises:
            WrongUseError: always; a recording has no controls.
        """
        raise WrongUseError(f"a recording has no controls, so {name!a} cannot be set to {value:g}")

    def _read(self, first_frame: int, frames: int) -> Any:  # noqa: ANN401
        import soundfile  # noqa: PLC0415 - as above

        try:
            if self._sound.tell() != first_frame:
                self._sound.seek(first_frame)
            samples = self._sound.read(frames, dtype="float64", always_2d=True)
        except soundfile.SoundFileError:
            samples = None
        if samples is None or samples.shape[0] < frames:
            at_s = first_frame / self._rate_hz
            raise BenchLostError(f"the recording ended within the block at {at_s:.2f} s: it is damaged ({self._name})")
        return samples

    def _wait_for(self, frame: int, stop: Event) -> None:
        while self._real and (missing := frame - self.next_frame) > 0:
            if stop.wait(min(missing / self._rate_hz, LONGEST_WAIT_S)):
                raise StoppedError("the capture was stopped")
        if stop.is_set():
            raise StoppedError("the capture was stopped")
