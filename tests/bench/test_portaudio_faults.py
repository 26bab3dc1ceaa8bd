"""Whatever the sound system does: one sentence within 2 s, silence, what was kept stays, and connecting goes on."""

import os
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.bench.audio_server import DEVICE, missing
from tests.bench.faults import BUSY, FAULTS, RATE_HZ, Fault, Table, in_place_of_sounddevice
from wattproof.app import open_bench
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Kind
from wattproof.core.wording import sentence
from wattproof.procedures.preflight import PreflightPlan
from wattproof.runner.preflight import Preflight

pytestmark = pytest.mark.server

SAID_S = 2.0
CLOSED_S = 5.0


@pytest.fixture(autouse=True)
def needs_a_server() -> None:
    lacking = missing()
    if lacking:
        pytest.skip(lacking)


@pytest.mark.parametrize("fault", [fault for fault in FAULTS if not fault.tested_below], ids=lambda fault: fault.name)
def test_a_fault_while_sweeping(fault: Fault, tmp_path: Path) -> None:
    if fault.change:
        with in_place_of_sounddevice(tmp_path / "changed", fault.change):
            table = Table(tmp_path, fault.device).__enter__()
    else:
        table = Table(tmp_path, fault.device, with_wire=fault.device != DEVICE).__enter__()
    with_table(table, fault)


def with_table(table: Table, fault: Fault) -> None:
    try:
        seen = table.see(fault.happens, fault.mend)
    finally:
        table.__exit__()
    assert re.search(fault.words, seen.sentence)
    assert "\n" not in seen.sentence
    assert seen.after_s < SAID_S or fault.change  # whose moment is not ours to choose
    assert seen.silent
    assert seen.kept >= 3
    assert seen.closes_s < CLOSED_S
    assert seen.goes_on


def test_a_rate_that_changed_underneath_is_said_and_the_new_one_goes_on(tmp_path: Path) -> None:
    with Table(tmp_path) as table:
        assert table.pump(lambda: table.kept() >= 3)
        table.server.kill()
        assert table.pump(lambda: table.ended() is not None)
        table.serve_anew(48_000)
        with pytest.raises(WrongUseError, match="does not open at 96000 Hz; choose a rate"):
            table.runner.reconnect()
        table.events.clear()
        table.runner.reconnect(lambda: open_bench(f"{DEVICE} rate=48000"))
        assert table.pump(lambda: table.kept() >= 3)
        assert table.runner.bench.identity.rate_hz == 48_000.0


def test_a_busy_device_is_said_in_one_line(tmp_path: Path) -> None:
    with (
        in_place_of_sounddevice(tmp_path / "changed", BUSY),
        pytest.raises(WrongUseError) as refused,
        Table(tmp_path),
    ):
        pass
    assert "Device unavailable" in str(refused.value)
    assert "look whether another program holds it" in str(refused.value)
    assert "\n" not in str(refused.value)


def test_a_second_program_on_the_device_is_noticed_before_the_first_tone(tmp_path: Path) -> None:
    with Table(tmp_path) as table:
        table.runner.stop()
        script = Path(__file__).with_name("player.py")
        player = subprocess.Popen(
            [sys.executable, str(script)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
        )
        assert player.stdin is not None
        assert player.stdout is not None
        try:
            assert player.stdout.readline() == "playing\n"
            verdict = Preflight(table.runner.bench, PreflightPlan()).run()
        finally:
            player.stdin.close()
            player.wait(5)
            player.stdout.close()
    said = [sentence(one) for one in verdict.warnings if one.kind is Kind.SOMETHING_PLAYS]
    assert len(said) == 1
    assert "input 1 is not silent: −26.0 dBFS, most of it at 440 Hz; another program plays" in said[0]


PROGRAM = f"""
import sys, time
from wattproof.runner.screen import Ended
from wattproof.app import open_watch
runner = open_watch({DEVICE!r})
runner.wish(level_fs=0.05, tone_on=True)
print("child", runner.bench.child_pid, flush=True)
deadline = time.monotonic() + 25.0
while time.monotonic() < deadline:
    for event in runner.screen.drain():
        print(time.monotonic(), type(event).__name__, getattr(event, "why", ""), flush=True)
        if isinstance(event, Ended):
            runner.close()
            sys.exit(0)
    time.sleep(0.01)
sys.exit("nothing was said")
"""


def test_a_machine_that_was_suspended_says_so_and_ends_in_silence(tmp_path: Path) -> None:
    with Table(tmp_path) as table:
        table.runner.stop()
        table.runner.bench.close()
        program = subprocess.Popen(
            [sys.executable, "-c", PROGRAM],
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            text=True,
            env=os.environ | {"PYTHONPATH": os.pathsep.join(sys.path)},
        )
        assert program.stdout is not None
        try:
            child = int(program.stdout.readline().split()[1])
            time.sleep(1.5)
            everybody = (program.pid, child, table.server.pid)
            for pid in everybody:
                os.kill(pid, signal.SIGSTOP)
            time.sleep(3.0)
            resumed = time.monotonic()
            for pid in reversed(everybody):
                os.kill(pid, signal.SIGCONT)
            lines = program.stdout.read().splitlines()
            assert program.wait(10) == 0
        finally:
            program.kill()
            program.communicate()
        at, kind, why = lines[-1].split(" ", 2)
        assert kind == "Ended"
        assert float(at) - resumed < SAID_S
        assert re.search("suspended or held|no samples came|stopped the stream", why)
        assert RATE_HZ == 96_000
