"""A bench that behaves, whose clock is told: frames come when the test gives them, and what sounds is remembered."""

import threading
import time
from collections.abc import Callable

import numpy as np

from wattproof.bench.protocol import Control, Identity
from wattproof.core.calibration import Calibration, Scale
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.quantity import Quantity
from wattproof.core.signal import Capture, Gap, Overload, Tone

RATE_HZ = 48_000.0
LATENCY = 480
FULL_SCALE_VRMS = 2.0
_LOOKS = 4000
_LOOK_S = 0.005  # how often a waiting capture looks at its stop event, which cannot wake it


class FakeBench:
    """A loop from the outputs to both inputs, LATENCY frames long. `auto` gives the frames that a capture asks for."""

    def __init__(self, *, auto: bool = True, real: bool = False, outputs: int = 2) -> None:
        self.auto = auto
        self.gaps: list[Gap] = []
        self.overloads: list[Overload] = []
        self.lost = False
        self.hangs = threading.Event()  # set: a capture answers nothing, not even its stop event
        self.play_hangs = threading.Event()  # set: a tone waits before it sounds
        self.playing = threading.Event()
        self.muted = False
        self.sounding: Tone | None = None
        self.heard: list[Tone] = []  # every tone that really sounded
        self.on_sound: Callable[[Tone], None] = lambda _tone: None
        self.closed = False
        self._identity = Identity("fake", RATE_HZ, 2, outputs, real=real)
        self._changed = threading.Condition()
        self._now = 0
        self._levels: list[tuple[int, float, float]] = [(0, 0.0, 1.0)]
        self._waiting_for: int | None = None

    @property
    def identity(self) -> Identity:
        return self._identity

    @property
    def calibration(self) -> Calibration:
        scales = tuple(Scale(socket, Quantity(FULL_SCALE_VRMS, "V"), "typed", "2026-01-01") for socket in (1, 2))
        return Calibration(device="fake", rate_hz=RATE_HZ, inputs=scales, outputs=scales)

    def open(self) -> None:
        return

    def close(self) -> None:
        self.mute()
        self.closed = True

    def play(self, tone: Tone) -> int:
        self.playing.set()
        while self.play_hangs.is_set():
            time.sleep(_LOOK_S)
        with self._changed:
            if self.lost:
                raise BenchLostError("the fake bench is gone")
            if not self.muted:
                self._sound(tone if tone.level_fs else None)
            return self._now + LATENCY

    def mute(self) -> None:
        with self._changed:
            self.muted = True
            self._sound(None)

    def release(self) -> None:
        with self._changed:
            self.muted = False

    @property
    def next_frame(self) -> int:
        with self._changed:
            return self._now

    def capture(self, first_frame: int, frames: int, stop: threading.Event) -> Capture:
        end = first_frame + frames
        with self._changed:
            if self.auto:
                self._now = max(self._now, end)
            self._waiting_for = end
            self._changed.notify_all()
            while self._now < end or self.hangs.is_set():
                if stop.is_set() and not self.hangs.is_set():
                    raise StoppedError("the capture was stopped")
                if self.lost:
                    raise BenchLostError("the fake bench is gone")
                self._changed.wait(_LOOK_S)
            if stop.is_set():
                raise StoppedError("the capture was stopped")
            self._waiting_for = None
            samples = self._samples(first_frame, frames)
        gaps = tuple(gap for gap in self.gaps if gap.first_frame < end and gap.first_frame + gap.frames > first_frame)
        return Capture(samples, RATE_HZ, first_frame, gaps, tuple(self.overloads))

    @property
    def controls(self) -> tuple[Control, ...]:
        return ()

    def turn(self, name: str, value: float) -> None:
        raise WrongUseError(f"the fake bench has no control {name}; {value:g} went nowhere")

    def give(self, frames: int) -> None:
        """Let time go on by so many frames."""
        with self._changed:
            self._now += frames
            self._changed.notify_all()

    def lose(self) -> None:
        """Vanish, as a device that is pulled out."""
        with self._changed:
            self.lost = True
            self._changed.notify_all()

    def wait_until_asked(self, or_else: Callable[[], bool] = lambda: False) -> int:
        """Wait until a capture waits for frames that are not there yet, and return how many are missing."""
        with self._changed:
            for _ in range(_LOOKS):
                if self._missing() > 0 or or_else():
                    return self._missing()
                self._changed.wait(_LOOK_S)
            raise AssertionError("nobody asked for frames")

    def _missing(self) -> int:
        return 0 if self._waiting_for is None else max(self._waiting_for - self._now, 0)

    def _sound(self, tone: Tone | None) -> None:
        self.sounding = tone
        level, frequency = (tone.level_fs, tone.frequency_hz) if tone else (0.0, 1.0)
        self._levels.append((self._now + LATENCY, level, frequency))
        if tone is not None:
            self.heard.append(tone)
            self.on_sound(tone)

    def _samples(self, first_frame: int, frames: int) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
        place = np.arange(first_frame, first_frame + frames)
        wave = np.zeros(frames)
        for start, level, frequency in self._levels:
            cycles = (place * (frequency / RATE_HZ)) % 1.0
            wave = np.where(place >= start, level * np.sin(2.0 * np.pi * cycles), wave)
        return np.stack([wave, 0.5 * wave], axis=1)
