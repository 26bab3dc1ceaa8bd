"""How often intervals and limits hold the truth, over tables drawn at random: python -m tests.benchmarks.coverage.

Each table is calibrated (loops at two levels, directly and through its divider, and by its meter), then its amplifier
is read and brought to volts and watts. JCGM 100:2008, 6.2: a 95 % interval is to encompass 95 of 100 true values.
"""

import argparse
import math
import sys
from collections.abc import Iterator
from functools import lru_cache

import attrs
import numpy as np

from tests.benchmarks.static_bench import FRAMES, ORDERS, RATE_HZ, TONE_HZ, Samples, Table, draw
from wattproof.core.calibration import Calibration
from wattproof.core.quantity import STATISTICS, Quantity
from wattproof.core.reading import Reading, ReadingSettings, Reference, State
from wattproof.core.rig import Attenuator, Load, Rig, Wiring
from wattproof.core.signal import Capture
from wattproof.dsp.interface_floor import Levels, own_lines
from wattproof.dsp.live import LiveReader
from wattproof.dsp.sources import FLOOR, FLOOR_NOISE, RESPONSE, stated95
from wattproof.dsp.sweep import Path, points
from wattproof.procedures.absolute import absolute
from wattproof.procedures.calibrate import CalibratePlan, Compared, Findings, LevelStep
from wattproof.procedures.calibration_record import Header, conclude
from wattproof.procedures.level_calibration import Meter, propose
from wattproof.procedures.read_recording import read_recording
from wattproof.procedures.wiring_check import Join

TABLES = 10_000
LEVELS_DB = (0.0, -12.0)
BLOCKS = 4  # averaged at the highest level, as a calibration does until noise is below what it resolves
TOP_FS = 0.5
LEAST_OVER_NOISE = 6.0  # a quantity nearer to its own noise is not asked to cover
WORST_CASES = 0.1  # of the variance: where worst cases make up more, the interval is a bound and covers more than 95 %
JOIN = Join(1, 1)


@attrs.define
class Tally:
    """How many intervals or limits there were, how many held the truth, and how wide they were."""

    seen: int = 0
    held: int = 0
    widths: list[float] = attrs.field(factory=list)

    def add(self, *, held: bool, width: float = math.nan) -> None:
        """Count one."""
        self.seen += 1
        self.held += held
        self.widths.append(width)

    @property
    def share(self) -> float:
        """How many of those that were seen held the truth."""
        return self.held / self.seen if self.seen else math.nan

    @property
    def median(self) -> float:
        """The median width."""
        told = [width for width in self.widths if math.isfinite(width)]
        return float(np.median(told)) if told else math.nan


@attrs.define
class Coverage:
    """All tallies: intervals by quantity, bounds and limits by quantity, and what must never happen."""

    tables: int = 0
    failed: int = 0
    intervals: dict[str, Tally] = attrs.field(factory=dict)
    bounds: dict[str, Tally] = attrs.field(factory=dict)
    limits: dict[str, Tally] = attrs.field(factory=dict)
    floors: dict[str, Tally] = attrs.field(factory=dict)  # the interface's bound against its true worst case, by order
    floors_as_readings: int = 0
    unseen_as_readings: int = 0


def calibrated(table: Table, rng: np.random.Generator) -> Calibration:
    """Return the calibration of a table, made by the program's own functions from captures of its loops."""
    settings = ReadingSettings(reference=Reference.FUNDAMENTAL)
    top_fs = min(TOP_FS, 0.8 / table.gain)
    findings = Findings((JOIN,), RATE_HZ, CalibratePlan(), format="24 bit")
    frequencies = points(10.0, 21_000.0)
    findings.paths[1] = Path(0.0, frequencies, table.response(frequencies), np.zeros(frequencies.size))
    findings.silence = {1: _read(table.loop(0.0, TONE_HZ, rng, pad=False), settings)}
    for down_db in LEVELS_DB:
        level_fs = top_fs * 10.0 ** (down_db / 20.0)
        for steps, pad in ((findings.direct, False), (findings.padded, True)):
            blocks = BLOCKS if down_db == 0.0 else 1
            captures = [table.loop(level_fs, TONE_HZ, rng, pad=pad) for _ in range(blocks)]
            steps.append(LevelStep(level_fs, {1: [_read(samples, settings, TONE_HZ) for samples in captures]}))
    meter = _sheet(table)
    hz = propose(meter).frequency_hz
    shown = table.meter.shows(top_fs * table.out_vrms * abs(table.out.gain(hz)))
    compared = _read(table.loop(top_fs, hz, rng, pad=False), settings, hz)
    findings.compared.append(Compared(JOIN, top_fs, shown, compared))
    return conclude(findings, Header("static", "2026-01-01"), meter)


def _sheet(table: Table) -> Meter:
    return Meter(percent=table.meter.percent, digits=table.meter.digits, step_v=table.meter.step_v)


@lru_cache(maxsize=16)
def _reader(settings: ReadingSettings, near_hz: float | None) -> LiveReader:
    """Return a reader that follows tones of one frequency; it prepares its fit once."""
    reader = LiveReader(RATE_HZ, (settings,))
    reader.restart(near_hz)
    return reader


def _read(samples: Samples, settings: ReadingSettings, near_hz: float | None = None) -> Reading:
    (reading,), _ = _reader(settings, near_hz).take(Capture(samples[:, None], RATE_HZ))
    return reading


def rig_of(table: Table) -> Rig:
    """Return the rig as a person knows it: nominal resistors, the measured load."""
    nominal = table.nominal
    attenuator = Attenuator(
        ratio=nominal.ratio,
        r1a_ohm=nominal.upper_ohm[0],
        r1b_ohm=nominal.upper_ohm[1],
        r2a_ohm=nominal.lower_ohm[0],
        r2b_ohm=nominal.lower_ohm[1],
        tolerance=table.tolerance,
        input_ohm=nominal.input_ohm,
        input_tolerance=table.input_tolerance,
        cable_pf=0.0,
    )
    load = Load(nominal_ohm=8.0, measured_ohm=table.load_measured_ohm, accuracy=table.load_accuracy)
    return Rig("static", (Wiring("left", 1, 1, load, attenuator),))


def truths(table: Table) -> dict[str, float]:
    """Return what each quantity truly is."""
    amplifier = table.amplifier
    total = math.hypot(1.0, amplifier.rest)
    return {
        "level": amplifier.level_vrms,
        "power": amplifier.level_vrms**2 / table.load_ohm,
        "THD": amplifier.thd / total,
        "THD+N": amplifier.rest / total,
        "noise": amplifier.noise / total,
        **{f"H{order}": abs(amplifier.harmonics[order]) for order in ORDERS},
    }


def _told(reading: Reading) -> Iterator[tuple[str, Quantity]]:
    named = (
        ("level", reading.level_vrms),
        ("power", reading.power_w),
        ("THD", reading.thd),
        ("THD+N", reading.thdn),
        ("noise", reading.noise),
    )
    yield from ((name, quantity) for name, quantity in named if quantity is not None)
    yield from ((f"H{each.order}", each.ratio) for each in reading.harmonics if each.order in ORDERS)


def judge(coverage: Coverage, table: Table, rng: np.random.Generator) -> None:
    """Calibrate and read one table, and count what its statements hold."""
    coverage.tables += 1
    calibration = calibrated(table, rng)
    whole = Capture(table.reading(rng)[:, None], RATE_HZ)
    (raw,) = read_recording(whole, ReadingSettings(), fundamental_hz=TONE_HZ)
    if raw.state is not State.OK:
        coverage.failed += 1
        return
    rig = rig_of(table)
    true = truths(table)
    for name, quantity in _told(absolute(raw, rig, calibration, table.drive_fs)):
        worst = table.worst(int(name[1:])) if name.startswith("H") else math.nan
        _count(coverage, name, quantity, true[name], worst)
    assert raw.fundamental_fs is not None
    own = own_lines(calibration, rig.wirings[0], Levels(raw.fundamental_fs.value, table.drive_fs))
    for order in ORDERS:
        worst = table.worst(order)
        tally = coverage.floors.setdefault(f"H{order}", Tally())
        tally.add(held=own[order].ratio >= worst, width=own[order].ratio / worst)


def _count(coverage: Coverage, name: str, quantity: Quantity, truth: float, worst: float) -> None:
    if quantity.limited_by is not None:
        tally = coverage.limits.setdefault(name, Tally())
        tally.add(held=truth <= quantity.value, width=quantity.value / (truth + worst))
        return
    scatter = math.hypot(*(part.u for part in quantity.parts if part.source == STATISTICS))
    if name.startswith("H"):
        coverage.floors_as_readings += truth == 0.0
        coverage.unseen_as_readings += quantity.value < 3.0 * math.sqrt(2.0) * scatter * (1.0 - 1e-6)
    if quantity.value < LEAST_OVER_NOISE * scatter:
        return
    interval = stated95(quantity)
    worst_cases = sum(
        part.u**2 for part in quantity.parts if part.source.startswith((FLOOR, RESPONSE, f"{FLOOR_NOISE} limit"))
    )
    group = coverage.bounds if worst_cases > WORST_CASES * quantity.u**2 else coverage.intervals
    held = abs(truth - quantity.value) <= interval.half_width
    group.setdefault(name, Tally()).add(held=held, width=interval.half_width / quantity.value)


def run(tables: int, seed: int = 1) -> Coverage:
    """Judge so many tables."""
    coverage = Coverage()
    for index in range(tables):
        rng = np.random.default_rng((seed, index))
        judge(coverage, draw(rng), rng)
    return coverage


def lines(coverage: Coverage) -> Iterator[str]:
    """Yield the table, the goal beside each row."""
    yield f"{coverage.tables} tables of {FRAMES / RATE_HZ:g} s readings, {coverage.failed} not read"
    yield f"{'':24}{'n':>8}{'holds %':>10}{'goal %':>10}   median width"
    for name, tally in coverage.intervals.items():
        yield f"{_row(name + ', interval', tally, '94-96')}   ±{100 * tally.median:.3g} %"
    for name, tally in coverage.bounds.items():
        yield f"{_row(name + ', worst cases', tally, '>= 95')}   ±{100 * tally.median:.3g} %"
    for name, tally in coverage.limits.items():
        width = f"   {tally.median:.3g} x the true worst case" if math.isfinite(tally.median) else ""
        yield f"{_row(name + ', limit', tally, '>= 95')}{width}"
    for name, tally in coverage.floors.items():
        yield f"{_row(name + ', |out| + |in|', tally, '>= 95')}   {tally.median:.3g} x the true worst case"
    yield f"harmonics that are not there, shown as readings: {coverage.floors_as_readings} (goal 0)"
    yield f"harmonics below 3·sqrt(Pn/BT), shown as readings: {coverage.unseen_as_readings} (goal 0)"


def _row(name: str, tally: Tally, goal: str) -> str:
    return f"{name:24}{tally.seen:8d}{100 * tally.share:10.2f}{goal:>10}"


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--tables", type=int, default=TABLES)
    parser.add_argument("--seed", type=int, default=1)
    given = parser.parse_args()
    sys.stdout.write("\n".join(lines(run(given.tables, given.seed))) + "\n")
