"""`wattproof read` keeps its streams apart: results on stdout, refusals and a bar on stderr, and a status for all."""

import json
import os
import pty
import subprocess
import sys
from pathlib import Path

import pytest
import soundfile

from wattproof.cli.read_output import exit_status
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Span
from wattproof.report.source import Source
from wattproof.runner.read_files import FileRead, FileRefused
from wattproof.signals.tone import sine

SOURCE = Source("tag.wav", rate_hz=48_000.0, frames=480, channels=1, sha256="00" * 32)
PROGRAM = (sys.executable, "-m", "wattproof", "read")


def read_as(*states: State) -> FileRead:
    span = Span(0, 480, 48_000.0)
    readings = (
        Reading(span=span, channel=number, settings=ReadingSettings(), state=state)
        for number, state in enumerate(states, 1)
    )
    return FileRead(SOURCE, tuple(readings))


@pytest.mark.parametrize("state", [state for state in State if state is not State.OK])
def test_the_status_is_one_where_any_reading_is_not_ok(state: State) -> None:
    assert exit_status([read_as(State.OK, State.OK)]) == 0
    assert exit_status([read_as(State.OK), read_as(State.OK, state)]) == 1


def test_the_status_is_two_where_a_file_was_refused_whatever_the_others_say() -> None:
    refused = FileRefused("gone.wav", "gone.wav: no such file")
    assert exit_status([refused, read_as(State.OK)]) == 2
    assert exit_status([read_as(State.NO_TONE), refused]) == 2


@pytest.fixture
def recording(tmp_path: Path) -> Path:
    path = tmp_path / "tag 31.wav"
    soundfile.write(path, sine(997.0, 48_000.0, 0, 48_000) / 2, 48_000, subtype="PCM_24")
    return path


def on_terminal(*arguments: str | Path) -> tuple[bytes, bytes, int]:
    """Run with stderr on a terminal; return stdout, what the terminal was sent, and the status."""
    screen, theirs = pty.openpty()
    with subprocess.Popen(
        [*PROGRAM, *arguments], stdout=subprocess.PIPE, stderr=theirs, env=os.environ | {"TERM": "xterm"}
    ) as running:
        os.close(theirs)
        out, _ = running.communicate(timeout=60)
    shown = b""
    while True:
        try:
            part = os.read(screen, 65536)
        except OSError:  # EIO: nobody holds the other end any more
            break
        if not part:
            break
        shown += part
    os.close(screen)
    return out, shown, running.returncode


def test_several_files_on_a_terminal_get_a_progress_bar_beside_clean_json(recording: Path) -> None:
    out, shown, status = on_terminal(recording, recording, "--json")
    assert status == 0
    assert len(json.loads(out)["files"]) == 2
    assert b"reading" in shown
    assert b"2/2" in shown


def test_a_single_file_needs_no_bar(recording: Path) -> None:
    out, shown, status = on_terminal(recording)
    assert status == 0
    assert b"THD+N" in out
    assert shown == b""


def test_away_from_a_terminal_there_is_no_bar_and_no_colour(recording: Path) -> None:
    done = subprocess.run([*PROGRAM, recording, recording], capture_output=True, check=False, timeout=60)
    assert (done.returncode, done.stderr) == (0, b"")
    assert b"\x1b" not in done.stdout
    assert done.stdout.count(b"Channel 1: ok") == 2
