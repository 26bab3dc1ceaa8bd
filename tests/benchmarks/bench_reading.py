"""What a full stereo reading costs, in multiples of one mono real FFT of the same block: a table with goals beside.

Run it by itself on a quiet machine: `python tests/benchmarks/bench_reading.py`. Ratios carry over from machine to
machine, times do not; so each reading is timed next to an FFT, in CPU time of its thread, and the median of the pairs'
ratios is printed.
"""

import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable

import attrs
import numpy as np

from wattproof.core.reading import ReadingSettings
from wattproof.core.signal import Capture
from wattproof.dsp.grid import grid_for
from wattproof.dsp.live import LiveReader

ONE_THREAD = "OPENBLAS_NUM_THREADS"
RATE_HZ = 96_000.0
TONE_HZ = 1801.0  # its eleventh harmonic, and no further one, lies below 20 kHz: the fundamental and ten harmonics
GOALS = {1.0: 6.0, 0.1: 12.0}  # multiples of one rfft, following a running tone; from cold twice that
COLD = 2.0
PAIRS = 60


@attrs.frozen
class Row:
    """One line of the table: what was timed, its ratio, and the goal (None where none was set)."""

    what: str
    seconds: float
    ratio: float
    goal: float | None
    reading_ms: float
    fft_ms: float


def _captures(seconds: float, count: int = 8) -> list[Capture]:
    """Stereo blocks of a running tone, 5 ppm off and in noise, as a live capture delivers them."""
    rng = np.random.default_rng(1)
    frames = grid_for(round(seconds * RATE_HZ)).frames
    captures = []
    for number in range(count):
        n = np.arange(number * frames, (number + 1) * frames)
        theta = 2.0 * np.pi * (TONE_HZ * (1.0 + 5e-6) * n / RATE_HZ % 1.0)
        channels = [0.5 * np.sin(theta + c) + 5e-4 * np.sin(2.0 * (theta + c)) for c in (0.0, 1.0)]
        noise = rng.normal(0.0, 1e-5, (frames, 2))
        captures.append(Capture(np.stack(channels, axis=1) + noise, RATE_HZ, number * frames))
    return captures


def _cpu_s(work: Callable[[], object]) -> float:
    start = time.thread_time()
    work()
    return time.thread_time() - start


def _row(what: str, seconds: float, goal: float | None, read: Callable[[Capture], object], pairs: int) -> Row:
    captures = _captures(seconds)
    mono = np.ascontiguousarray(captures[0].samples[:, 0])
    for capture in captures:  # fills caches, of the processor as of the program
        read(capture)
        np.fft.rfft(mono)
    ffts, readings = [], []
    for number in range(pairs):
        capture = captures[number % len(captures)]
        ffts.append(_cpu_s(lambda: np.fft.rfft(mono)))
        readings.append(_cpu_s(lambda capture=capture: read(capture)))  # type: ignore[misc]  # bound now, called now
    ratio = statistics.median(reading / fft for reading, fft in zip(readings, ffts, strict=True))
    return Row(what, seconds, ratio, goal, 1e3 * statistics.median(readings), 1e3 * statistics.median(ffts))


def rows(pairs: int = PAIRS) -> list[Row]:
    """Time every row of the table."""
    settings = (ReadingSettings(), ReadingSettings())
    found = []
    for seconds, goal in GOALS.items():
        follower, painter, starter = (LiveReader(RATE_HZ, settings) for _ in range(3))

        def cold(capture: Capture, reader: LiveReader = starter) -> object:
            reader.restart()
            return reader.take(capture)

        def painted(capture: Capture, reader: LiveReader = painter) -> object:
            return reader.take(capture, 1)

        found += [
            _row("following", seconds, goal, follower.take, pairs),
            _row("following, with picture", seconds, goal, painted, pairs),
            _row("from cold", seconds, COLD * goal, cold, pairs),
        ]
    return found


def table(found: list[Row]) -> str:
    """Return the rows as text, the goal beside each."""
    head = f"{'stereo reading, 96 kHz':<26}{'block':>7}{'ratio':>8}{'goal':>7}{'reading':>11}{'one rfft':>11}"
    lines = [head]
    for row in found:
        goal = "" if row.goal is None else f"≤ {row.goal:g}"
        met = "" if row.goal is None else "  met" if row.ratio <= row.goal else "  missed"
        times = f"{row.reading_ms:>8.2f} ms{row.fft_ms:>8.2f} ms"
        lines.append(f"{row.what:<26}{row.seconds:>5g} s{row.ratio:>8.1f}{goal:>7}{times}{met}")
    return "\n".join(lines)


def main() -> int:
    """Print the table, with matrix products on one thread: numpy reads that at its import, so in a fresh process."""
    if os.environ.get(ONE_THREAD) != "1":
        again = subprocess.run([sys.executable, __file__], env={**os.environ, ONE_THREAD: "1"}, check=False)
        return again.returncode
    sys.stdout.write(table(rows()) + "\n")
    return 0


if __name__ == "__main__":
    sys.exit(main())
