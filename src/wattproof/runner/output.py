"""What sounds: every tone passes the drive limit here, and silence is possible from any thread at once."""

import threading
from collections.abc import Callable

from wattproof.bench.protocol import Bench
from wattproof.core.signal import Tone
from wattproof.runner.limits import DriveLimit
from wattproof.runner.screen import Screen, ToneChanged

PATIENCE_S = 0.1  # a bench that takes longer to play hangs; the tone is then looked at once it sounds


class Output:
    """The way of a tone to the bench.

    Two kinds of silence, both at once: `mute` is a latch that only `release`, so a new run, lifts; `hush` lasts until
    the procedure has learnt of it (`heard`) and plays again. `on_change` is told of every silence that did not come
    through the procedure, so that no block across it is read.
    """

    def __init__(self, bench: Bench, limit: DriveLimit, screen: Screen, on_change: Callable[[], None]) -> None:
        self._bench = bench
        self._limit = limit
        self._screen = screen
        self._on_change = on_change
        self._muted = threading.Event()
        self._hushed = threading.Event()
        self._tone_lock = threading.Lock()  # never taken on the way to silence: a bench that hangs may hold it
        self._told_lock = threading.Lock()  # held over no call to the bench
        self._sounding: Tone | None = None

    @property
    def muted(self) -> bool:
        """Whether the latch is set: nothing sounds until a new run."""
        return self._muted.is_set()

    @property
    def sounding(self) -> Tone | None:
        """The tone that sounds, or None in silence."""
        return self._sounding

    def play(self, tone: Tone) -> int:
        """Sound a tone and return the absolute frame from which it stands; while muted or hushed nothing sounds.

        Raises:
            WrongUseError: the tone is above the drive limit; it does not sound.
            BenchLostError: the device is gone.
        """
        with self._tone_lock:
            self._limit.check(tone)
            self._lift_hush()
            stands = self._bench.play(tone)
            with self._told_lock:
                silent = self._silenced() or tone.level_fs == 0.0
                before, self._sounding = self._sounding, None if silent else tone
                if before != self._sounding:
                    self._tell(tone, on=not silent)
        self.hush_above_limit()
        return stands

    def take_bench(self, bench: Bench) -> None:
        """Sound through another bench from now on; it stays muted until `release`."""
        bench.mute()
        self._muted.set()
        self._bench = bench

    def heard(self) -> bool:
        """Return whether it was hushed since the last call, so that the procedure learns of it; then it may sound."""
        hushed = self._hushed.is_set()
        self._hushed.clear()
        return hushed

    def hush(self, why: str = "") -> None:
        """Fall silent at once, until the procedure has heard of it and plays again. From any thread."""
        self._hushed.set()
        self._silence(why)

    def mute(self, why: str = "") -> None:
        """Fall silent at once and stay so until `release`. From any thread."""
        self._muted.set()
        self._silence(why)

    def release(self) -> None:
        """Lift the latch for a new run; nothing sounds until it plays."""
        self._hushed.clear()
        self._muted.clear()
        self._bench.release()

    def change_limit(self, change: Callable[[], None]) -> None:
        """Change the drive limit between two tones, never while one is on its way; silence what is above it now."""
        free = self._tone_lock.acquire(timeout=PATIENCE_S)
        try:
            change()
        finally:
            if free:
                self._tone_lock.release()
        self.hush_above_limit()

    def hush_above_limit(self) -> bool:
        """Fall silent if what sounds is above the drive limit as it stands now; return whether it was."""
        tone = self._sounding
        if tone is None or self._limit.allows(tone):
            return False
        self.hush("the tone was above the new drive limit")
        return True

    def _silenced(self) -> bool:
        return self._hushed.is_set() or self._muted.is_set()

    def _lift_hush(self) -> None:
        if self._silenced():
            return
        self._bench.release()
        if self._silenced():  # meanwhile: the latch goes back before any tone
            self._bench.mute()

    def _silence(self, why: str) -> None:
        self._bench.mute()
        self._on_change()
        with self._told_lock:
            tone, self._sounding = self._sounding, None
            if tone is not None:
                self._tell(tone, on=False, why=why)

    def _tell(self, tone: Tone, *, on: bool, why: str = "") -> None:
        self._screen.tell(ToneChanged(on, tone.frequency_hz, tone.level_fs, why))
