"""A bench that is lost says so within 2 s to whoever waits for it, keeps what came, and can always be closed."""

import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from pathlib import Path

import pytest

from tests.bench.audio_server import DEVICE, AudioServer
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.portaudio.marker import Marker
from wattproof.core.errors import BenchLostError
from wattproof.core.signal import Capture, Gap, Tone

pytestmark = pytest.mark.server

RATE_HZ = 96_000
SAID_S = 2.0  # a loss is said within 2 s
CLOSED_S = 5.0  # the deadlines of process.Child.end together stay below


@pytest.fixture
def stop() -> threading.Event:
    """Ends a capture that a failing test would leave waiting."""
    return threading.Event()


@pytest.fixture
def threads(stop: threading.Event) -> Iterator[ThreadPoolExecutor]:
    with ThreadPoolExecutor(2) as pool:
        yield pool
        stop.set()


def opened(
    device: str, threads: ThreadPoolExecutor, stop: threading.Event
) -> tuple[PortaudioBench, int, "Future[Capture]"]:
    """A bench with a tone, the frame from which it stands, and a capture that waits for more than will come."""
    bench = PortaudioBench(device, RATE_HZ)
    bench.open()
    stands = bench.play(Tone(997.0, 0.5, (1, 2)))
    bench.capture(stands, RATE_HZ // 2, threading.Event())
    return bench, stands, threads.submit(bench.capture, bench.next_frame, 60 * RATE_HZ, stop)


def check_lost(
    bench: PortaudioBench, stands: int, waiting: "Future[Capture]", threads: ThreadPoolExecutor, words: str
) -> None:
    with pytest.raises(BenchLostError, match=words) as lost:
        waiting.result(SAID_S)
    assert "\n" not in str(lost.value)
    assert bench.capture(stands, RATE_HZ // 2, threading.Event()).frames == RATE_HZ // 2  # what came is kept
    with pytest.raises(BenchLostError, match=words):
        bench.play(Tone(997.0, 0.5))
    bench.mute()
    threads.submit(bench.close).result(CLOSED_S)
    assert bench.child_pid is not None
    assert not Path(f"/proc/{bench.child_pid}").exists()  # ended and buried


def test_a_killed_server_is_said_and_the_bench_still_closes(
    audio_server: AudioServer, threads: ThreadPoolExecutor, stop: threading.Event
) -> None:
    bench, stands, waiting = opened(DEVICE, threads, stop)
    audio_server.kill()
    check_lost(bench, stands, waiting, threads, "loopback: .*connect again")


def test_a_server_that_was_held_for_a_moment_makes_the_capture_suspect(audio_server: AudioServer) -> None:
    bench = PortaudioBench(DEVICE, RATE_HZ, marker=Marker())
    bench.open()
    try:
        bench.capture(bench.next_frame, RATE_HZ, threading.Event())  # the usual is learnt
        held = bench.next_frame
        os.kill(audio_server.pid, signal.SIGSTOP)
        time.sleep(0.15)  # half of what is taken for a loss
        os.kill(audio_server.pid, signal.SIGCONT)
        capture = bench.capture(held - 1_000, RATE_HZ // 2, threading.Event())
        bench.capture(bench.next_frame, RATE_HZ, threading.Event())  # time to make it good
        later = bench.capture(held - 1_000, RATE_HZ // 2, threading.Event())
    finally:
        bench.close()
    assert any(_near(gap, held) for gap in capture.gaps if gap.why == "flag")
    assert any(_near(gap, held) for gap in later.gaps if gap.why == "clock")


def _near(gap: Gap, frame: int) -> bool:
    return gap.first_frame <= frame + 2_048 and frame - 2_048 <= gap.first_frame + gap.frames


@pytest.mark.usefixtures("audio_server")
def test_a_killed_child_is_said(threads: ThreadPoolExecutor, stop: threading.Event) -> None:
    bench, stands, waiting = opened(DEVICE, threads, stop)
    assert bench.child_pid is not None
    os.kill(bench.child_pid, signal.SIGKILL)
    check_lost(bench, stands, waiting, threads, "without a word")


@pytest.mark.usefixtures("audio_server")
def test_a_child_that_hangs_is_ended(threads: ThreadPoolExecutor, stop: threading.Event) -> None:
    bench, stands, waiting = opened(DEVICE, threads, stop)
    assert bench.child_pid is not None
    os.kill(bench.child_pid, signal.SIGSTOP)  # it hears neither the pipe nor SIGTERM
    check_lost(bench, stands, waiting, threads, "no samples came for 0.3 s")


@pytest.mark.usefixtures("audio_server")
@pytest.mark.parametrize(("ends", "words"), [("politely", "exact zeros"), ("killed", "no samples came|stopped")])
def test_a_device_that_goes_away_is_said(
    ends: str, words: str, threads: ThreadPoolExecutor, stop: threading.Event
) -> None:
    script = Path(__file__).with_name("wire.py")
    wire = subprocess.Popen([sys.executable, str(script)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    assert wire.stdin is not None
    assert wire.stdout is not None
    try:
        assert wire.stdout.readline() == "ready\n"
        bench, stands, waiting = opened("JACK/wire", threads, stop)
        if ends == "politely":
            wire.stdin.close()
            wire.wait(5)
        else:
            wire.kill()
        check_lost(bench, stands, waiting, threads, words)
    finally:
        wire.kill()
        wire.wait(5)
        wire.stdin.close()
        wire.stdout.close()
