"""A server that really loses periods: what is delivered is the tone bit for bit, and every loss is refused."""

import os
import signal
import threading
import time
from pathlib import Path

import numpy as np
import pytest

from tests.bench.audio_server import DEVICE, AudioServer, missing
from tests.bench.expected_tone import CYCLE, sine
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.portaudio.marker import Marker
from wattproof.core.notes import Note
from wattproof.core.signal import Samples, Tone
from wattproof.procedures.requests import Acquire
from wattproof.runner.acquire import Blocks

pytestmark = pytest.mark.server

RATE_HZ = 96_000
PERIOD = 256  # the shorter, the sooner a client is too late
STEPS = 1_361  # of rate / CYCLE: 996.8 Hz
BLOCK = RATE_HZ // 4
LIMIT_S = 40.0  # on a busy machine the server itself is late, and few late clients cost a period
HOLDS_S = (0.004, 0.006, 0.010, 0.020)


def test_a_late_client_loses_periods_and_no_number_is_made_of_them(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    lacking = missing()
    if lacking:
        pytest.skip(lacking)
    with AudioServer(tmp_path, RATE_HZ, PERIOD, synchronous=False) as server:
        for name, value in server.environment.items():
            monkeypatch.setenv(name, value)
        bench = PortaudioBench(DEVICE, RATE_HZ, marker=Marker())
        bench.open()
        try:
            check(bench)
        finally:
            bench.close()


def check(bench: PortaudioBench) -> None:
    refused: list[Note] = []
    blocks = Blocks(bench, threading.Event(), refused.append)
    tone = Tone(STEPS * RATE_HZ / CYCLE, 0.5, (1, 2))
    stands = bench.play(tone)
    blocks.tone_stands(stands, tone)
    begun = stands - round(0.010 * RATE_HZ)
    truth = Truth(bench, begun)
    over = threading.Event()
    thread = threading.Thread(target=hold_again_and_again, args=(bench, over))
    thread.start()
    try:
        deadline = time.monotonic() + LIMIT_S
        while len(truth.lost_at) < 1 and time.monotonic() < deadline:
            capture = blocks.acquire(Acquire(BLOCK))
            assert any(holds(capture.samples[:, 0], capture.first_frame - begun, shift) for shift in SHIFTS), (
                f"a block across a loss was delivered, {capture.first_frame}; lost at {truth.lost_at}"
            )
            truth.look(capture.span.end_frame)
    finally:
        over.set()
        thread.join()
    assert truth.lost_at, "the server lost nothing: the test tells nothing"
    assert refused


TABLE = (0.5 * sine(1, 0, CYCLE)).astype(np.float32)  # one period: place n of it is n / CYCLE of a cycle
SHIFTS = tuple(PERIOD * periods for periods in range(-12, 13))  # a loss may change the delay by whole periods


def holds(samples: Samples, first: int, shift: int) -> bool:
    """Whether samples are, bit for bit, the tone that is `shift` frames late or early."""
    places = (first + shift + np.arange(len(samples))) * STEPS % CYCLE
    return bool(np.array_equal(samples.astype(np.float32), TABLE[places]))


class Truth:
    """Holds every period of the raw capture against the tone: where it is not the tone that it was, one was lost."""

    def __init__(self, bench: PortaudioBench, begun: int) -> None:
        self._bench = bench
        self._begun = begun
        self._next = -(-(begun + round(0.020 * RATE_HZ)) // PERIOD) * PERIOD
        self._shift = 0
        self.lost_at: list[int] = []

    def look(self, end_frame: int) -> None:
        """Look at all whole periods before end_frame."""
        self._next = max(self._next, (end_frame - 4 * RATE_HZ) // PERIOD * PERIOD)  # older frames are not held
        frames = (end_frame - self._next) // PERIOD * PERIOD
        if frames <= 0:
            return
        raw = self._bench.capture(self._next, frames, threading.Event()).samples[:, 0]
        if not holds(raw, self._next - self._begun, self._shift):
            for first in range(self._next, self._next + frames, PERIOD):
                self._look_at(raw[first - self._next : first - self._next + PERIOD], first)
        self._next += frames

    def _look_at(self, raw: Samples, first: int) -> None:
        if not holds(raw, first - self._begun, self._shift):
            self.lost_at.append(first)
            fitting = [shift for shift in SHIFTS if holds(raw, first - self._begun, shift)]
            self._shift = fitting[0] if fitting else self._shift


def hold_again_and_again(bench: PortaudioBench, over: threading.Event) -> None:
    """Hold the process that serves the device for longer than a period, again and again."""
    assert bench.child_pid is not None
    turn = 0
    while not over.wait(0.3):
        os.kill(bench.child_pid, signal.SIGSTOP)
        time.sleep(HOLDS_S[turn % len(HOLDS_S)])
        os.kill(bench.child_pid, signal.SIGCONT)
        turn += 1
