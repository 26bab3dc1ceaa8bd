"""Runs the real bench for minutes under load and accounts for every frame: read, refused, or wrong.

python -m tests.benchmarks.long_run [MINUTES [RATE_HZ [BUSY_PROCESSES]]]

A synchronous server gives back bit for bit what is played, so every frame that is delivered is held against the sine of
whole-number phase that it must be. Prints one JSON object a minute, and one at the end.
"""

import json
import os
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path

import numpy as np

from tests.bench.audio_server import DEVICE, AudioServer
from tests.bench.expected_tone import CYCLE
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.portaudio.marker import Marker
from wattproof.core.notes import Note
from wattproof.core.reading import ReadingSettings
from wattproof.core.signal import Tone
from wattproof.core.wording import sentence
from wattproof.dsp.live import LiveReader
from wattproof.procedures.requests import Acquire
from wattproof.runner.acquire import Blocks

PEAK = 0.0625
READINGS_PER_S = 24
BUSY = """
import time
while True:
    until = time.monotonic() + 0.01
    while time.monotonic() < until:
        pass
    time.sleep(0.01)
"""


def cpu_s(pid: int) -> float:
    """Return the processor time that a process has used, s."""
    fields = Path(f"/proc/{pid}/stat").read_text(encoding="utf-8").rpartition(")")[2].split()
    return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")


class Run:
    """One run: what is played, what must come back, and what came."""

    def __init__(self, bench: PortaudioBench) -> None:
        self.bench = bench
        self.rate_hz = round(bench.identity.rate_hz)
        self.steps = round(997.0 / self.rate_hz * CYCLE)
        self.refused: list[Note] = []
        self.blocks = Blocks(bench, threading.Event(), self.refused.append)
        self.reader = LiveReader(self.rate_hz, (ReadingSettings(), ReadingSettings()))
        table = np.sin(2.0 * np.pi * np.arange(-CYCLE // 2, CYCLE // 2) / CYCLE)
        self.expected = (PEAK * table).astype(np.float32)
        self.taken = self.wrong = self.skipped = self.readings = 0
        self.read_s = self.cut_s = 0.0
        tone = Tone(self.steps * self.rate_hz / CYCLE, PEAK, (1, 2))
        self.reader.restart(tone.frequency_hz)
        self.first = self.next = bench.play(tone)
        self.blocks.tone_stands(self.first, tone)
        ramp = round(0.010 * self.rate_hz)
        self.begun = self.first - ramp - bench.round_trip.frames  # where the sine's phase is 0, in played frames

    def step(self) -> None:
        """Take one block, hold what is new of it against what it must be, and read it."""
        hop = self.rate_hz // READINGS_PER_S
        started = time.thread_time()
        capture = self.blocks.acquire(Acquire(self.reader.next_frames, hop))
        self.cut_s += time.thread_time() - started
        first, end = max(self.next, capture.first_frame), capture.span.end_frame
        self.skipped += max(0, capture.first_frame - self.next)
        place = np.arange(first, end) - self.bench.round_trip.frames - self.begun
        must = self.expected[(place * self.steps + CYCLE // 2) % CYCLE]
        came = capture.samples[first - capture.first_frame :].astype(np.float32)
        self.wrong += int(np.count_nonzero((came != must[:, None]).any(axis=1)))
        self.taken += end - first
        self.next = end
        started = time.thread_time()
        self.readings += bool(self.reader.take(capture, 1)[0])
        self.read_s += time.thread_time() - started

    def account(self, since: float, child_before_s: float) -> dict[str, object]:
        """Return what came so far."""
        seconds = time.monotonic() - since
        child = self.bench.child_pid
        return {
            "seconds": round(seconds, 1),
            "frames_due": self.next - self.first,
            "frames_taken": self.taken,
            "frames_skipped": self.skipped,
            "frames_wrong": self.wrong,
            "refused": len(self.refused),
            "suspects_cleared": self.blocks.content.cleared,
            "readings_per_s": round(self.readings / seconds, 2),
            "callback_process_cpu": round((cpu_s(child) - child_before_s) / seconds, 4) if child else None,
            "reading_cpu": round(self.read_s / seconds, 4),
            "cutting_and_content_cpu": round(self.cut_s / seconds, 4),
            "load_average": round(os.getloadavg()[0], 2),
        }


def main(minutes: float, rate_hz: int, busy: int) -> int:
    """Run, print, and return 0 where every frame is accounted for."""
    loaders = [subprocess.Popen(["nice", "-n", "10", sys.executable, "-c", BUSY]) for _ in range(busy)]
    try:
        with tempfile.TemporaryDirectory() as folder, AudioServer(Path(folder), rate_hz) as server:
            os.environ.update(server.environment)
            bench = PortaudioBench(DEVICE, rate_hz, marker=Marker())
            bench.open()
            try:
                return watch(Run(bench), minutes)
            finally:
                bench.close()
    finally:
        for loader in loaders:
            loader.kill()
            loader.wait()


def watch(run: Run, minutes: float) -> int:
    """Run for so long."""
    since, minute = time.monotonic(), 1
    child_before_s = cpu_s(run.bench.child_pid or 0)
    while time.monotonic() - since < 60.0 * minutes:
        run.step()
        if time.monotonic() - since > 60.0 * minute:
            minute += 1
            sys.stdout.write(json.dumps(run.account(since, child_before_s)) + "\n")
            sys.stdout.flush()
    account = run.account(since, child_before_s)
    account["refusals"] = [sentence(note) for note in run.refused]
    sys.stdout.write(json.dumps(account) + "\n")
    whole = run.taken + run.skipped == run.next - run.first
    return 0 if whole and run.wrong == 0 else 1


if __name__ == "__main__":
    given = sys.argv[1:]
    sys.exit(
        main(
            float(given[0]) if given else 20.0,
            int(given[1]) if len(given) > 1 else 96_000,
            int(given[2]) if len(given) > 2 else 1,
        )
    )
