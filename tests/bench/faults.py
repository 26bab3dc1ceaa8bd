"""Faults of a sound system while a drive sweep runs, each on a real server of its own, and what a person sees."""

import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Self

import attrs
import numpy as np

from tests.bench.audio_server import DEVICE, AudioServer
from wattproof.app import open_bench
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.core.signal import Capture, Tone
from wattproof.procedures.requests import Acquire, Kept, Play, Procedure
from wattproof.runner.screen import Ended, Event, ReadingKept, ToneChanged
from wattproof.runner.watching import WatchRunner

HERE = Path(__file__).parent
RATE_HZ = 96_000
LIMIT_S = 20.0
STEPS_BEFORE = 3  # kept before the fault comes
RAISING = """
import sys
real = __import__("importlib.util").util
place = next(path for path in sys.path if path != {folder!r} and __import__("os").path.exists(path + "/sounddevice.py"))
spec = real.spec_from_file_location("real_sounddevice", place + "/sounddevice.py")
module = real.module_from_spec(spec)
spec.loader.exec_module(module)
globals().update({{name: value for name, value in vars(module).items() if not name.startswith("__")}})
{change}
"""
FAILING_CALLBACK = """
def Stream(*, callback, **given):
    calls = [0]
    def late(indata, outdata, frames, times, status):
        calls[0] += 1
        callback(indata, outdata, frames, None if calls[0] > 200 else times, status)
    return module.Stream(callback=late, **given)
"""
BUSY = """
def Stream(**given):
    raise module.PortAudioError("Error opening Stream: Device unavailable [PaErrorCode -9985]", -9985)
"""


@attrs.frozen
class Seen:
    """What a person saw of one fault: the sentence, after how long, what was kept, whether it went on afterwards."""

    sentence: str
    after_s: float
    kept: int
    silent: bool
    closes_s: float
    goes_on: bool


class Table:
    """A server, and a runner that raises the drive in small steps and keeps a reading of each."""

    def __init__(self, folder: Path, device: str = DEVICE, *, with_wire: bool = False) -> None:
        self.folder = folder
        self.device = device
        self.server = AudioServer(folder)
        self.events: list[Event] = []
        self.wire: subprocess.Popen[str] | None = None
        self._with_wire = with_wire
        self._before = dict(os.environ)
        self.runner: WatchRunner

    def __enter__(self) -> Self:
        self.serve(self.server)
        try:
            if self._with_wire:
                self.plug()
            self.runner = WatchRunner(self.open(), Rig, Calibration(), self._sweep)
            self.runner.reopen = self.open
            self.runner.begin()
        except BaseException:
            self.__exit__()
            raise
        return self

    def __exit__(self, *_: object) -> None:
        if hasattr(self, "runner"):
            self.runner.close()
        self.unplug()
        self.server.stop()
        os.environ.clear()
        os.environ.update(self._before)

    def serve(self, server: AudioServer) -> None:
        """Start a server and make it the one that is found."""
        self.server = server
        server.__enter__()
        os.environ.update(server.environment)

    def serve_anew(self, rate_hz: int = RATE_HZ) -> None:
        """Start another server in the place of one that is gone."""
        self.server.stop()
        self.serve(AudioServer(self.folder, rate_hz))

    def open(self) -> Bench:
        """Open the device as the program does."""
        return open_bench(self.device)

    @property
    def child_pid(self) -> int:
        """The process that holds the stream."""
        bench = self.runner.bench
        assert isinstance(bench, PortaudioBench)
        assert bench.child_pid is not None
        return bench.child_pid

    def plug(self) -> None:
        """Start the device that can vanish."""
        command = [sys.executable, str(HERE / "wire.py")]
        self.wire = subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
        assert self.wire.stdout is not None
        assert self.wire.stdout.readline() == "ready\n"

    def unplug(self, *, politely: bool = False) -> None:
        """End the device that can vanish."""
        if self.wire is not None:
            assert self.wire.stdin is not None
            assert self.wire.stdout is not None
            if not politely:
                self.wire.kill()
            self.wire.stdin.close()
            self.wire.wait(5)
            self.wire.stdout.close()
            self.wire = None

    def pump(self, until: Callable[[], bool]) -> bool:
        """Listen to the screen until something is so; return whether it came to be in time."""
        deadline = time.monotonic() + LIMIT_S
        while time.monotonic() < deadline:
            self.events += self.runner.screen.drain()
            if until():
                return True
            time.sleep(0.01)
        return False

    def kept(self) -> int:
        """How many readings the screen was told to be kept."""
        return sum(isinstance(event, ReadingKept) for event in self.events)

    def ended(self) -> Ended | None:
        """How the run ended, if it did."""
        return next((event for event in self.events if isinstance(event, Ended)), None)

    def see(self, fault: Callable[["Table"], None], mend: Callable[["Table"], None] = lambda _table: None) -> Seen:
        """Let a fault happen while the sweep runs, mend it, connect again, and return what was seen."""
        assert self.pump(lambda: self.kept() >= STEPS_BEFORE), self.events
        at = time.monotonic()
        before = self.kept()
        fault(self)
        assert self.pump(lambda: self.ended() is not None), "nobody was told"
        after_s = time.monotonic() - at
        ended = self.ended()
        assert ended is not None
        assert ended.ending is Ending.FAILED
        tones = [event for event in self.events if isinstance(event, ToneChanged)]
        silent = not tones[-1].on and self.runner.muted
        at = time.monotonic()
        self.runner.stop()
        self.runner.bench.close()
        closes_s = time.monotonic() - at
        mend(self)
        kept = self.kept()
        assert kept >= before
        self.events.clear()
        self.runner.reconnect()
        goes_on = self.pump(lambda: self.kept() >= STEPS_BEFORE)
        return Seen(ended.why, after_s, kept, silent, closes_s, goes_on)

    def _sweep(self) -> Procedure:
        """Raise the drive in steps of half a dB, and keep a reading of each."""
        for step in range(80):
            tone = Tone(997.0, 0.001 * 10.0 ** (step / 40.0), (1, 2))
            yield Play(tone)
            capture = yield Acquire(RATE_HZ // 10, settle_s=0.02)
            assert isinstance(capture, Capture)
            peak = float(np.abs(capture.samples).max())
            reading = Reading(span=capture.span, channel=1, settings=ReadingSettings(), state=State.OK, peak_fs=peak)
            yield Kept(reading)


@contextmanager
def in_place_of_sounddevice(folder: Path, change: str) -> Iterator[None]:
    """Put a module before sounddevice that is the real one but for a change; only new processes see it."""
    folder.mkdir()
    text = RAISING.format(folder=str(folder), change=change)
    (folder / "sounddevice.py").write_text(text, encoding="utf-8")
    sys.path.insert(0, str(folder))
    try:
        yield
    finally:
        sys.path.remove(str(folder))


def kill_server(table: Table) -> None:
    table.server.kill()


def hold_server(table: Table) -> None:
    """Hold the server; `let_go` releases it after 3 s in all."""
    os.kill(table.server.pid, signal.SIGSTOP)


def let_go(table: Table) -> None:
    time.sleep(2.0)
    os.kill(table.server.pid, signal.SIGCONT)
    time.sleep(0.5)


def kill_child(table: Table) -> None:
    os.kill(table.child_pid, signal.SIGKILL)


def hang_child(table: Table) -> None:
    os.kill(table.child_pid, signal.SIGSTOP)


def end_wire(table: Table) -> None:
    table.unplug(politely=True)


def kill_wire(table: Table) -> None:
    table.unplug()


def plug_again(table: Table) -> None:
    table.plug()


def wait(_table: Table) -> None:
    """Do nothing: the fault was built in."""


def serve_again(table: Table) -> None:
    table.serve_anew()


@attrs.frozen
class Fault:
    """One row: what happens, on which device, how it is mended, and what the sentence must say."""

    name: str
    happens: Callable[[Table], None]
    words: str
    mend: Callable[[Table], None] = wait
    device: str = DEVICE
    change: str = ""
    tested_below: bool = False  # test_portaudio_lost.py has it, on the bench alone: it takes the server ten seconds


FAULTS = (
    Fault("audio server killed while sweeping", kill_server, "stopped the stream|no samples came", serve_again),
    Fault("device's process killed", kill_wire, "no samples came|stopped", plug_again, "JACK/wire", tested_below=True),
    Fault("device ended politely", end_wire, "exact zeros", plug_again, "JACK/wire"),
    Fault("server held for 3 s", hold_server, "no samples came for 0.3 s", let_go),
    Fault("process that holds the stream killed", kill_child, "ended without a word", tested_below=True),
    Fault("process that holds the stream hangs", hang_child, "no samples came for 0.3 s", tested_below=True),
    Fault("exception in the callback", wait, "failed: AttributeError", change=FAILING_CALLBACK),
)
