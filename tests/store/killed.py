"""Kills a writing program at random moments, again and again, and tells what each kill left behind, as JSON lines.

It runs as a program of its own with one thread, so that it may fork: a child of it needs no second to start.
"""

import json
import os
import signal
import sys
import time
from contextlib import suppress
from pathlib import Path

import attrs
import numpy as np

from tests.store.made import begun, calibration, made_readings, made_session
from wattproof.store.recheck import written_wrong
from wattproof.store.session_file import SessionFile
from wattproof.store.session_reader import MissingCaptureError, SessionReader
from wattproof.store.session_values import Keeping

KILLS_OF_A_FILE = 10
LONGEST_S = 0.1
KNOWN = calibration()
MADE = list(made_readings(6, KNOWN))


def write_until_killed(path: Path, told: int) -> None:
    """Keep one reading after the other, and say so once each is on the disk."""
    log = begun(SessionFile(path), KNOWN, Keeping.ALL)
    os.write(told, b"!")
    for number in range(10**9):
        kept, raw, block = MADE[number % len(MADE)]
        shift = (number // len(MADE)) * 1_000_000
        raw = attrs.evolve(raw, first_frame=raw.first_frame + shift)
        log.keep(kept, raw, attrs.evolve(block, first_frame=block.first_frame + shift)).result()
        os.write(told, b".")


def killed(path: Path, after_s: float, *, begun_first: bool) -> int:
    """Start to write, kill at some moment, and return how many readings were said to be kept (−1: no run yet).

    `begun_first` counts the time from when the run was begun, else from the start of the program.
    """
    hear, told = os.pipe()
    child = os.fork()
    if child == 0:
        os.close(hear)
        write_until_killed(path, told)
    os.close(told)
    heard = os.read(hear, 1) if begun_first else b""
    time.sleep(after_s)
    os.kill(child, signal.SIGKILL)
    os.waitpid(child, 0)
    while part := os.read(hear, 65536):
        heard += part
    os.close(hear)
    return len(heard) - 1


def found(path: Path, said: int) -> dict[str, object]:
    """Return what the file holds now: of its last run the readings, how many have their capture, and what is wrong."""
    with SessionReader(path) as reader:
        wrong = list(written_wrong(reader))
        runs = reader.runs
        readings = runs[-1].readings if runs and said >= 0 else ()
        captured = 0
        for stored in readings:
            with suppress(MissingCaptureError):
                captured += runs[-1].samples.capture(stored, stored.raw).frames == stored.raw.frames
    return {"said": max(said, 0), "readings": len(readings), "captured": captured, "wrong": wrong}


def is_unmade(path: Path) -> bool:
    """Whether the program was killed before its file was one: a beginner's log takes back what there is of it."""
    return not path.exists() or path.stat().st_size == 0 or path.with_name(path.name + "-journal").exists()


def main(folder: Path, times: int) -> None:
    """Kill `times` times and print a line for each."""
    dice = np.random.default_rng(1)
    made_session(folder / "warm.wattproof", 2)  # what is made at the first use is made before the forks
    for number in range(times):
        path = folder / f"killed-{number // KILLS_OF_A_FILE}.wattproof"
        said = killed(path, LONGEST_S * dice.random(), begun_first=number % 4 > 0)
        nothing = {"said": max(said, 0), "readings": 0, "captured": 0, "wrong": []}
        sys.stdout.write(json.dumps(nothing if is_unmade(path) else found(path, said)) + "\n")


if __name__ == "__main__":
    main(Path(sys.argv[1]), int(sys.argv[2]))
