"""What sessions hold as rows: readings, and the points of their statements."""

from collections.abc import Iterator
from pathlib import Path

from wattproof.procedures.again import PLANS
from wattproof.procedures.comparing import Sitting
from wattproof.procedures.statement import PowerStatement, conclude
from wattproof.report.table_columns import Cell, Origin, point_row, reading_row
from wattproof.store.session_reader import SessionReader, StoredRun


def statement_of(run: StoredRun) -> PowerStatement:
    """Return the statement that a run's readings amount to, concluded anew."""
    conditions = run.conditions
    return conclude(conditions.plan, conditions.rows, run.records)


def sittings_of(path: Path) -> list[Sitting]:
    """Return the power statements of a session, in order.

    Raises:
        WrongUseError: the file cannot be read.
    """
    with SessionReader(path) as reader:
        named = f"{reader.device.name}, {path.name}" if reader.device.name else path.name
        runs = [run for run in reader.runs if run.facts.procedure in PLANS]
        return [
            Sitting(
                named + (f", run {run.number}" if len(runs) > 1 else ""),
                statement_of(run),
                run.facts.rig,
                run.conditions.calibration,
            )
            for run in runs
        ]


def reading_rows(reader: SessionReader) -> Iterator[dict[str, Cell]]:
    """Yield every reading of a session as a row."""
    for run in reader.runs:
        origin = _origin(reader, run)
        for number, stored in enumerate(run.readings_from(0, run.reading_count), 1):
            yield reading_row(origin, number, stored.kept)


def point_rows(reader: SessionReader) -> Iterator[dict[str, Cell]]:
    """Yield every point of every power statement of a session as a row."""
    for run in reader.runs:
        if run.facts.procedure in PLANS:
            origin = _origin(reader, run)
            for stated in statement_of(run).rows:
                yield from (point_row(origin, stated, point) for point in stated.points)


def _origin(reader: SessionReader, run: StoredRun) -> Origin:
    device = reader.device
    return Origin(reader.path.name, device.name, device.serial, run.number, run.facts.procedure, run.at)
