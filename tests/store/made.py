"""Small sessions for the tests: a tone in noise with some distortion, read as a live run reads it."""

import math
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from wattproof.core.calibration import Calibration, Scale
from wattproof.core.quantity import Part, Quantity
from wattproof.core.rig import Attenuator, Load, Rig, Wiring
from wattproof.core.run import Ending
from wattproof.core.signal import Capture
from wattproof.procedures.absolute import absolute
from wattproof.procedures.curve_reader import curve_reader
from wattproof.procedures.power_plan import StepsPlan
from wattproof.procedures.power_rows import Place, Row, rows_of, settings_of, wired_as
from wattproof.procedures.requests import Kept, Mark, Role
from wattproof.store.session_file import RunLog, SessionFile
from wattproof.store.session_values import BenchFacts, Keeping, Stretch

RATE_HZ = 48_000.0
LEAD, BLOCK = 2_400, 9_600
BITS = 24
RIG = Rig("table", (Wiring(load=Load(measured_ohm=8.02), attenuator=Attenuator(ratio=10.0)),))
PLAN = StepsPlan(hold_s=0.0)
BENCH = BenchFacts("made by a test", RATE_HZ, 1, 1, real=False, seeds={"made": 7})


def calibration(volts: float = 2.0) -> Calibration:
    scale = Scale(1, Quantity(volts, "V rms", (Part("level calibration", 0.004 * volts),)), "measured", "2026-03-01")
    return Calibration(device="made by a test", rate_hz=RATE_HZ, inputs=(scale,), date="2026-03-01")


def place(known: Calibration) -> Place:
    return Place(RATE_HZ, 1, RIG, known, {1: 1.0}, curve_reader, real=False)


def rows(known: Calibration) -> tuple[Row, ...]:
    return rows_of(PLAN, place(known))


def raw_samples(
    level_fs: float, frames: int, seed: int, channels: int = 1
) -> "np.ndarray[tuple[int, int], np.dtype[np.float64]]":
    """Return 997 Hz with a third harmonic that rises with the level, in noise, as a 24 bit converter gives it."""
    dice = np.random.default_rng(seed)
    phase = 2.0 * np.pi * 997.0 / RATE_HZ * np.arange(frames)[:, None]
    wave = level_fs * (np.sin(phase) + 0.2 * level_fs**4 * np.sin(3.0 * phase)) + 1e-5 * dice.standard_normal(
        (frames, channels)
    )
    return np.asarray(np.rint(wave * 2.0 ** (BITS - 1)) / 2.0 ** (BITS - 1))


def made_readings(count: int, known: Calibration) -> Iterator[tuple[Kept, Capture, Stretch]]:
    """Yield readings with their raw captures, each drive higher than the one before."""
    row = rows(known)[0]
    reader = curve_reader(RATE_HZ, settings_of(PLAN, place(known), row))
    for number in range(count):
        level = 0.9 * math.pow(10.0, (number - count + 1) / 20.0)
        first = number * 30_000
        raw = Capture(raw_samples(level, LEAD + BLOCK, number), RATE_HZ, first)
        block = Capture(raw.samples[LEAD:], RATE_HZ, first + LEAD)
        reader.restart(997.0)
        (reading,), _ = reader.take(block)
        stated = absolute(reading, wired_as(RIG, row), known, level)
        yield Kept(stated, Mark(Role.STEP, drive_fs=level)), raw, Stretch(first + LEAD, BLOCK)


def begun(session: SessionFile, known: Calibration, keeping: Keeping = Keeping.ALL) -> RunLog:
    return session.begin_run("power", PLAN, RIG, known, BENCH, rows=rows(known), keeping=keeping)


def made_session(path: Path, count: int = 8, volts: float = 2.0) -> str:
    """Write a session of one run to its end and return its hash; a file that is there is gone on with."""
    known = calibration(volts)
    with SessionFile(path) as session:
        log = begun(session, known)
        for kept, raw, block in made_readings(count, known):
            log.keep(kept, raw, block)
        log.end(Ending.DONE)
        return session.head
