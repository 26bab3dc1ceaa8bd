"""However a run ends, the loudspeaker gets a ramp and then nothing: judged sample by sample through the loopback."""

import os
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from tests.bench.audio_server import DEVICE
from tests.bench.expected_tone import CYCLE
from tests.bench.test_portaudio_silence import RATE_HZ, SILENCE_S, STEPS, judge, recorder, wait_until_gone

pytestmark = pytest.mark.server

PEAK = 0.0625  # below the drive limit of a real output; a power of two, so that products are exact
ENDINGS = ("its end", "stop", "mute from a thread", "hush", "an exception", "a lost reading", "SIGTERM", "SIGKILL")
PROGRAM = f"""
import sys, threading, time
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Rig, Wiring
from wattproof.core.signal import Tone
from wattproof.procedures.requests import Acquire, Play
from wattproof.runner.live import Runner

ending = sys.argv[1]
bench = PortaudioBench({DEVICE!r}, {RATE_HZ})
bench.open()
runner = Runner(bench, Rig("two", (Wiring("left", 1, 1), Wiring("right", 2, 2))), Calibration())

def procedure():
    yield Play(Tone({STEPS * RATE_HZ / CYCLE!r}, {PEAK!r}, (1, 2)))
    yield Acquire({RATE_HZ} // 2)
    print(bench.child_pid, flush=True)
    if ending == "an exception":
        raise RuntimeError("a fault of the procedure")
    if ending == "a lost reading":
        raise WrongUseError("a limit was passed")
    while ending != "its end":
        yield Acquire({RATE_HZ} // 10)

runner.start(procedure())
time.sleep(0.9)
if ending == "stop":
    runner.stop()
if ending == "mute from a thread":
    threading.Thread(target=runner.mute).start()
if ending == "hush":
    runner.set_drive_limit_fs(0.01)
time.sleep(1.0 if not ending.startswith("SIG") else 60.0)
runner.close()
"""


@pytest.mark.usefixtures("audio_server")
def test_a_run_ends_by_a_ramp_however_it_ends(tmp_path: Path) -> None:
    file = tmp_path / "record.npy"
    with recorder(file):
        for ending in ENDINGS:
            run_and_end(ending)
            time.sleep(SILENCE_S)
    judge(np.load(file), len(ENDINGS), PEAK)


def run_and_end(ending: str) -> None:
    """Run a program whose run ends in one way, and wait until the process that held the device is gone."""
    program = subprocess.Popen(
        [sys.executable, "-c", PROGRAM, ending], stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True
    )
    try:
        assert program.stdout is not None
        child = int(program.stdout.readline())
        if ending.startswith("SIG"):
            time.sleep(0.3)
            os.kill(program.pid, 9 if ending == "SIGKILL" else 15)
        wait_until_gone(child)
    finally:
        program.kill()
        program.communicate()
