"""Gathers what a report shows of a session file: statements made anew from its readings, pictures from raw captures."""

import math
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from wattproof.core.calibration import Calibration
from wattproof.core.picture import Picture
from wattproof.core.rig import Wiring
from wattproof.dsp.interface_floor import Levels, own_noise
from wattproof.procedures.again import PLANS, Again
from wattproof.procedures.requests import Role
from wattproof.procedures.statement import PowerStatement, StatedPoint, StatedRow
from wattproof.report.session_content import OwnFloor, PointPicture, RunContent, SessionContent
from wattproof.runner.session_table import statement_of
from wattproof.store.session_reader import MissingCaptureError, SessionReader, StoredRun
from wattproof.store.session_values import StoredReading


def session_content(path: Path) -> SessionContent:
    """Return the content of a session's report.

    Raises:
        WrongUseError: the file cannot be read; the line says why.
    """
    with SessionReader(path) as reader:
        photos = reader.photos
        runs = tuple(_run(run) for run in reader.runs if run.facts.procedure in PLANS)
        return SessionContent(
            file=path.name,
            device=reader.device,
            begun_at=reader.begun_at,
            notes=reader.notes,
            runs=runs,
            head=reader.head,
            photo=photos[-1].content if photos else None,
        )


def _run(run: StoredRun) -> RunContent:
    facts, conditions, ending = run.facts, run.conditions, run.ending
    statement = statement_of(run)
    return RunContent(
        number=run.number,
        at=run.at,
        procedure=facts.procedure,
        bench=facts.bench.name,
        real=facts.bench.real,
        rate_hz=facts.bench.rate_hz,
        seeds=facts.bench.seeds,
        rig=facts.rig,
        calibration=conditions.calibration,
        ending=None if ending is None else ending.ending,
        why="" if ending is None else ending.why,
        readings=run.reading_count,
        statement=statement,
        pictures=tuple(_pictures(run, statement)),
        versions=facts.versions,
    )


def _pictures(run: StoredRun, statement: PowerStatement) -> Iterator[PointPicture]:
    again = Again(run.conditions)
    for stated in statement.rows:
        for point in stated.points:
            found = _reading_at(run, stated, point)
            if found is None:
                continue
            held = found.kept.mark is not None and found.kept.mark.role is Role.HELD
            try:
                picture = again.draw(found.kept, run.samples.capture(found, found.block))
            except MissingCaptureError:
                continue
            if picture is not None:
                floor = _floor(picture, stated.row.wiring, run.conditions.calibration)
                yield PointPicture(stated.row.index, point.at, held, picture, floor)


def _reading_at(run: StoredRun, stated: StatedRow, point: StatedPoint) -> StoredReading | None:
    """Return the last held reading of a point, else the nearest on the curve."""
    own = [each for each in run.readings if each.kept.mark is not None and each.kept.mark.row == stated.row.index]
    held = [each for each in own if each.kept.mark is not None and each.kept.mark.at == point.at]
    if held:
        return held[-1]
    volts = point.voltage_vrms
    if volts is None:
        return None
    read = [
        (level.value, each) for each in own if (level := each.kept.reading.level_vrms) is not None and level.value > 0.0
    ]
    return min(read, key=lambda pair: abs(math.log(pair[0] / volts.value)), default=(0.0, None))[1]


def _floor(picture: Picture, wiring: Wiring, calibration: Calibration) -> OwnFloor | None:
    """Return the interface's own noise in the picture's unit: as its loop showed it, else white over the band."""
    fundamental = picture.reading.fundamental_fs
    if fundamental is None or fundamental.value <= 0.0:
        return None
    loop = calibration.loop(wiring.input)
    to_ratio = math.sqrt(picture.noise_bandwidth_hz) / fundamental.value
    if loop is not None and loop.noise:
        nearest = min(loop.noise, key=lambda each: abs(each.tone_fs - fundamental.value))
        return OwnFloor(nearest.frequency_hz, nearest.density_fs * to_ratio, white=False)
    own = own_noise(calibration, wiring, Levels(fundamental.value, None))
    if own is None:
        return None
    low, high = picture.reading.settings.band_hz
    ratio = own.value / math.sqrt(high - low) * to_ratio
    return OwnFloor(np.array([20.0, 24_000.0]), np.array([ratio, ratio]), white=True)
