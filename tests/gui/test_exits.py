"""Every way out of the window is silent: signals, errors, a closed window. Each runs in a process of its own."""

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

pytestmark = pytest.mark.display

PROGRAM = """
import sys, threading
from PySide6.QtCore import QTimer
from tests.gui.fake_runner import FakeRunner
from wattproof.gui.main import run

class Told(FakeRunner):
    def mute(self):
        super().mute()
        print("muted", flush=True)
    def stop(self, deadline_s=2.0):
        super().stop()
        print("stopped", flush=True)
    def kept(self):
        return {kept}

def make():
    made = Told()
    QTimer.singleShot(300, lambda: print("open", flush=True))
    {then}
    return made

sys.exit(run(make))
"""


def start(display: str, kept: str = "0", then: str = "pass") -> subprocess.Popen[str]:
    root = Path(__file__).parents[2]
    environment = {**os.environ, "DISPLAY": display, "QT_QPA_PLATFORM": "xcb", "PYTHONPATH": f"{root}/src:{root}"}
    return subprocess.Popen(
        [sys.executable, "-c", PROGRAM.format(kept=kept, then=then)],
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def read_until(process: subprocess.Popen[str], word: str, patience_s: float = 60.0) -> None:
    assert process.stdout is not None
    end = time.monotonic() + patience_s
    while time.monotonic() < end:
        line = process.stdout.readline()
        if word in line or not line:
            return


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGINT, signal.SIGHUP])
def test_a_signal_silences_and_closes(display: str, number: signal.Signals) -> None:
    process = start(display)
    read_until(process, "open")
    process.send_signal(number)
    out, errors = process.communicate(timeout=60)
    assert process.returncode == 128 + number, errors
    assert out.split()[0] == "muted"
    assert "stopped" in out


def test_an_error_of_the_programs_own_silences_and_says_so(display: str) -> None:
    process = start(display, kept="1 // 0")
    out, errors = process.communicate(timeout=60)
    assert process.returncode == 1, errors
    assert "stopped" in out
    assert "ZeroDivisionError" in errors


def test_an_error_inside_a_frame_silences_and_ends_with_status_one(display: str) -> None:
    process = start(
        display,
        kept="0 if len(sys.argv) == 1 else 1 // 0",
        then='QTimer.singleShot(500, sys.argv.append("x") or (lambda: None))',
    )
    out, errors = process.communicate(timeout=60)
    assert process.returncode == 1, errors
    assert "stopped" in out
    assert "ZeroDivisionError" in errors


def test_a_closed_window_ends_with_status_zero(display: str) -> None:
    from_inside = "QTimer.singleShot(500, lambda: __import__('PySide6').QtWidgets.QApplication.closeAllWindows())"
    process = start(display, then=from_inside)
    out, errors = process.communicate(timeout=60)
    assert process.returncode == 0, errors
    assert "stopped" in out
    assert not errors
