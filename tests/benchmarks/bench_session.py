"""How fast a session is rechecked, and whether opening, listing and appending stay flat; run it by hand.

`python -m tests.benchmarks.bench_session [readings]` prints one line a figure. Times are of this machine, taken while
nothing else should run; the ratios (real time per core, growth) are what counts.
"""

import hashlib
import resource
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import attrs
import numpy as np

from tests.store.made import PLAN, RIG, begun, calibration, made_readings, place, rows
from wattproof.core.calibration import Calibration
from wattproof.core.run import Ending
from wattproof.core.signal import Capture
from wattproof.procedures.absolute import absolute
from wattproof.procedures.again import Again, Conditions
from wattproof.procedures.curve_reader import curve_reader
from wattproof.procedures.power_rows import settings_of, wired_as
from wattproof.procedures.requests import Kept, Mark, Role
from wattproof.store.samples import decoded, encoded
from wattproof.store.session_file import SessionFile
from wattproof.store.session_reader import SessionReader
from wattproof.store.session_values import Stretch

RATE_HZ, CHANNELS, SECONDS = 96_000.0, 2, 1.0
TIMES = 20
STEPS = (1_000, 10_000, 100_000)


def cpu_s(action: Callable[[], object], times: int = TIMES) -> float:
    """Return the processor time of one call, the smallest of three rounds."""
    rounds = []
    for _ in range(3):
        before = resource.getrusage(resource.RUSAGE_SELF).ru_utime
        for _ in range(times):
            action()
        rounds.append((resource.getrusage(resource.RUSAGE_SELF).ru_utime - before) / times)
    return min(rounds)


def samples() -> "np.ndarray[tuple[int, int], np.dtype[np.float64]]":
    """Return one second of two channels: a clipping tone in noise, 24 bits."""
    dice = np.random.default_rng(1)
    wave = 0.8 * np.sin(2.0 * np.pi * 997.0 / RATE_HZ * np.arange(round(RATE_HZ * SECONDS)))[:, None]
    both = np.clip(wave, -0.7, 0.7) + 1e-5 * dice.standard_normal((wave.size, CHANNELS))
    return np.asarray(np.rint(both * 2.0**23) / 2.0**23)


def recheck_parts() -> None:
    """Print decode, hash and fit of one second apart, and what they come to."""
    raw = samples()
    coding, content = encoded(raw, RATE_HZ)
    known = attrs.evolve(calibration(), rate_hz=RATE_HZ, inputs=calibration().inputs)
    block = Capture(raw, RATE_HZ)
    spot = attrs.evolve(place(known), rate_hz=RATE_HZ, inputs=CHANNELS)
    row = rows(known)[0]
    reader = curve_reader(RATE_HZ, settings_of(PLAN, spot, row))
    reader.restart(997.0)
    (reading, *_), _ = reader.take(block)
    kept = Kept(absolute(reading, wired_as(RIG, row), known, 0.8), Mark(Role.STEP, drive_fs=0.8))
    again = Again(Conditions(PLAN, (row,), RIG, known, RATE_HZ, CHANNELS))
    parts = {
        "decode": cpu_s(lambda: decoded(coding, content, *raw.shape)),
        "hash": cpu_s(lambda: hashlib.sha256(content).hexdigest()),
        "fit": cpu_s(lambda: again.read(kept, block)),
    }
    for name, seconds in parts.items():
        sys.stdout.write(
            f"{name}: {1e3 * seconds:.1f} ms for {SECONDS:g} s of {CHANNELS} channels at {RATE_HZ / 1e3:g} kHz\n"
        )
    sys.stdout.write(f"recheck: {SECONDS / sum(parts.values()):.0f} times real time on one core\n")
    encoding = 1e3 * cpu_s(lambda: encoded(raw, RATE_HZ))
    sys.stdout.write(f"encode: {encoding:.1f} ms; {coding}, {len(content) / raw.size:.2f} bytes a sample\n")


def growth(steps: tuple[int, ...]) -> None:
    """Print the time of opening, listing and appending with more and more readings in the file."""
    known = calibration()
    kept, raw, _ = next(made_readings(1, known))
    small = attrs.evolve(raw, samples=raw.samples[:16])
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "grown.wattproof")
        there = 0
        for wanted in steps:
            _filled(path, known, (kept, small), wanted - there)
            there = wanted
            opening = _least(lambda: SessionReader(path).close())
            listing = _least(lambda: _listed(path))
            appending = _least(lambda: _appended(path, known, (kept, small)))
            size = path.stat().st_size / 1e6
            times = f"open {opening:.1f} ms, list {listing:.1f} ms, append {appending:.1f} ms"
            sys.stdout.write(f"{wanted} readings, {size:.0f} MB: {times}\n")


def _filled(path: Path, known: Calibration, each: tuple[Kept, Capture], count: int) -> None:
    kept, raw = each
    with SessionFile(path) as session:
        log = begun(session, known)
        for number in range(count):
            log.keep(kept, attrs.evolve(raw, first_frame=16 * number), Stretch(16 * number, 16))
        log.end(Ending.DONE)


def _listed(path: Path) -> list[tuple[int, int]]:
    with SessionReader(path) as reader:
        return [(run.number, run.reading_count) for run in reader.runs]


def _appended(path: Path, known: Calibration, each: tuple[Kept, Capture]) -> None:
    _filled(path, known, each, 1)


def _least(action: Callable[[], object]) -> float:
    times = []
    for _ in range(5):
        before = time.perf_counter()
        action()
        times.append(time.perf_counter() - before)
    return 1e3 * min(times)


if __name__ == "__main__":
    most = int(sys.argv[1]) if len(sys.argv) > 1 else STEPS[-1]
    recheck_parts()
    growth(tuple(step for step in STEPS if step <= most))
