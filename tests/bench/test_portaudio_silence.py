"""However the program ends during a tone, the loudspeaker gets a ramp and then nothing: judged sample by sample."""

import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.bench.audio_server import DEVICE
from tests.bench.expected_tone import CYCLE, RAMP_S, largest_step, ramp, sine

pytestmark = pytest.mark.server

RATE_HZ = 96_000
RAMP = round(RAMP_S * RATE_HZ)
STEPS = 1_361
GONE_LIMIT_S = 5.0
SILENCE_S = 0.3  # recorded after the child is gone
ENDINGS = ("SIGKILL", "SIGTERM", "SIGSTOP", "raise", "close", "SIGTERM to the child")
PROGRAM = f"""
import sys, time
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.core.signal import Tone
bench = PortaudioBench({DEVICE!r}, {RATE_HZ})
bench.open()
bench.play(Tone({STEPS * RATE_HZ / CYCLE!r}, 0.5, (1, 2)))
print(bench.child_pid, flush=True)
time.sleep(0.4)
if sys.argv[1] == "raise":
    raise RuntimeError("a fault of the program")
if sys.argv[1] == "close":
    bench.close()
time.sleep(60)
"""


@contextmanager
def recorder(file: Path) -> Iterator[None]:
    """A second program on the server that records the device; the file is there afterwards."""
    script = Path(__file__).with_name("recorder.py")
    process = subprocess.Popen(
        [sys.executable, str(script), str(file)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    )
    try:
        assert process.stdout is not None
        assert process.stdout.readline() == "recording\n"
        yield
        process.communicate(timeout=20)
    finally:
        process.kill()
        process.communicate()


def alive(pid: int) -> bool:
    """Whether a process runs; one that has ended and waits to be buried does not."""
    try:
        state = Path(f"/proc/{pid}/stat").read_text(encoding="utf-8").rpartition(")")[2].split()[0]
    except (FileNotFoundError, ProcessLookupError):
        return False
    return state != "Z"


def wait_until_gone(pid: int) -> None:
    deadline = time.monotonic() + GONE_LIMIT_S
    while alive(pid):
        assert time.monotonic() < deadline, f"process {pid} still runs"
        time.sleep(0.02)


def judge(record: NDArray[np.float32], tones: int = len(ENDINGS), peak: float = 0.5) -> None:
    """The record is one tone for each ending, with a raised-cosine start and end, and exact zeros all around."""
    sounding = np.flatnonzero(record.any(axis=1))
    rests = np.flatnonzero(np.diff(sounding) > SILENCE_S * RATE_HZ / 2)
    firsts, lasts = sounding[np.r_[0, rests + 1]], sounding[np.r_[rests, len(sounding) - 1]]
    assert len(firsts) == tones
    expected = np.zeros(len(record))
    for first, last in zip(firsts.tolist(), lasts.tolist(), strict=True):
        begin, fall = first - 1, last - RAMP + 2  # the first sample is sin 0, the last value of the fall is 0
        frames = fall + RAMP - begin
        weight = np.ones(frames)
        weight[:RAMP] = ramp(RAMP)
        weight[-RAMP:] = 1.0 - ramp(RAMP)
        assert frames > 0.2 * RATE_HZ
        expected[begin : fall + RAMP] = peak * sine(STEPS, 0, frames) * weight
    assert len(record) - int(lasts[-1]) > SILENCE_S / 2 * RATE_HZ
    np.testing.assert_array_equal(record[:, 0], expected.astype(np.float32))
    np.testing.assert_array_equal(record[:, 1], expected.astype(np.float32))
    assert np.abs(np.diff(record, axis=0)).max() <= largest_step(peak, STEPS * RATE_HZ / CYCLE, RATE_HZ)


def run_and_end(ending: str) -> None:
    """Run a program that plays, have it end, and wait until the process that held the device is gone."""
    program = subprocess.Popen(
        [sys.executable, "-c", PROGRAM, ending], stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True
    )
    try:
        assert program.stdout is not None
        child = int(program.stdout.readline())
        time.sleep(0.3)
        if ending == "SIGTERM to the child":
            os.kill(child, signal.SIGTERM)
        elif ending.startswith("SIG"):
            program.send_signal(getattr(signal, ending))
        wait_until_gone(child)
    finally:
        program.kill()
        program.communicate()


@pytest.mark.usefixtures("audio_server")
def test_the_tone_ends_by_a_ramp_however_the_program_ends(tmp_path: Path) -> None:
    file = tmp_path / "record.npy"
    with recorder(file):
        for ending in ENDINGS:
            run_and_end(ending)
            time.sleep(SILENCE_S)
    judge(np.load(file))
