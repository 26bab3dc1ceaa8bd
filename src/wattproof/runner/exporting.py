"""Writes sessions out for other programs: tables, captures as sound files, drawings as pictures."""

import csv
import io
import json
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path

import soundfile

from wattproof.core.errors import WrongUseError
from wattproof.procedures.again import PLANS
from wattproof.report.power_figures import curve_svg
from wattproof.report.table_columns import POINT_DICTIONARY, READING_DICTIONARY, Cell
from wattproof.runner.session_table import point_rows, reading_rows, statement_of
from wattproof.store.samples import Coding, decoded
from wattproof.store.schema import SUFFIX
from wattproof.store.session_reader import SessionReader, StoredRun
from wattproof.store.session_values import Kind, StoredSamples
from wattproof.store.values import structured

Row = Mapping[str, Cell]
_FLAC = (Coding.FLAC16, Coding.FLAC24)


def csv_text(rows: Sequence[Row], columns: Sequence[str]) -> str:
    """Return rows as CSV (RFC 4180), the decimal sign a point whatever the locale."""
    file = io.StringIO(newline="")
    writer = csv.DictWriter(file, columns)
    writer.writeheader()
    writer.writerows(rows)
    return file.getvalue()


def export_session(path: Path, folder: Path, *, parquet: bool = False) -> list[Path]:
    """Write one session into a folder of its name and return the files.

    Raises:
        WrongUseError: the session cannot be read, the folder not written, or Parquet is wanted without its library.
    """
    target = folder / path.stem
    try:
        target.mkdir(parents=True, exist_ok=True)
        with SessionReader(path) as reader:
            return list(_written(reader, target, parquet=parquet))
    except OSError as error:
        raise WrongUseError(
            f"{target}: it cannot be written ({error.strerror or error}); give another folder"
        ) from error


def _written(reader: SessionReader, target: Path, *, parquet: bool) -> Iterator[Path]:
    tables = (("readings", reading_rows, READING_DICTIONARY), ("points", point_rows, POINT_DICTIONARY))
    for name, rows_of, dictionary in tables:
        rows = list(rows_of(reader))
        yield _text(target / f"{name}.csv", csv_text(rows, list(dictionary)))
        yield _text(target / f"{name}.json", json.dumps(rows, indent=1))
        yield _text(target / f"{name}.dictionary.json", json.dumps(dictionary, indent=1))
        if parquet:
            yield _parquet(target / f"{name}.parquet", rows, dictionary)
    for run in reader.runs:
        yield from _captures(reader, run, target / "captures")
        if run.facts.procedure in PLANS:
            yield from _drawings(run, target)


def _captures(reader: SessionReader, run: StoredRun, target: Path) -> Iterator[Path]:
    """Write raw captures: FLAC as it is stored, else WAV with floats. Names count run and first frame."""
    target.mkdir(exist_ok=True)
    for record in reader.of_run(run.seq, Kind.CAPTURE):
        stored, content = structured(record.content, StoredSamples), reader.content(record.seq)
        if content is None:
            continue
        coding = Coding(stored.coding)
        path = target / f"run-{run.number}-frame-{stored.first_frame}.{'flac' if coding in _FLAC else 'wav'}"
        if coding in _FLAC:
            path.write_bytes(content)
        else:
            samples = decoded(coding, content, stored.frames, stored.channels)
            soundfile.write(
                path, samples, round(stored.rate_hz), subtype="DOUBLE" if coding is Coding.FLOAT64 else "FLOAT"
            )
        yield path


def _drawings(run: StoredRun, target: Path) -> Iterator[Path]:
    svg = curve_svg(statement_of(run))
    if svg:
        from wattproof.report.drawing_png import drawing_png  # noqa: PLC0415 - loads the typesetter

        yield _text(target / f"run-{run.number}-thdn.svg", svg)
        path = target / f"run-{run.number}-thdn.png"
        path.write_bytes(drawing_png(svg))
        yield path


def _parquet(path: Path, rows: Sequence[Row], dictionary: Mapping[str, Mapping[str, str]]) -> Path:
    try:
        import pyarrow as pa  # noqa: PLC0415 - an optional extra
        import pyarrow.parquet as pq  # noqa: PLC0415 - likewise
    except ImportError as error:
        raise WrongUseError(
            "Parquet needs a library that is not installed; pip install 'wattproof[parquet]'"
        ) from error
    fields = [
        pa.field(name, _kind([row[name] for row in rows], pa), metadata=dict(about))
        for name, about in dictionary.items()
    ]
    columns = {field.name: [row[field.name] for row in rows] for field in fields}
    pq.write_table(pa.table(columns, schema=pa.schema(fields)), path)
    return path


def _kind(values: Sequence[Cell], pa: object) -> object:
    kinds = {type(value) for value in values if value is not None}
    name = "string" if str in kinds else "float64" if float in kinds or not kinds else "int64"
    return getattr(pa, name)()


def table_of(folder: Path) -> tuple[list[Row], list[str]]:
    """Return the points of all statements of all sessions below a folder, and one line for each that cannot be read.

    Raises:
        WrongUseError: there is no session.
    """
    files = sorted(folder.rglob(f"*{SUFFIX}"))
    if not files:
        raise WrongUseError(f"{folder}: there is no session (NAME{SUFFIX}) in it; give another folder")
    rows: list[Row] = []
    refused = []
    for file in files:
        try:
            with SessionReader(file) as reader:
                rows += point_rows(reader)
        except (WrongUseError, ValueError, KeyError) as error:
            refused.append(f"{file}: {error}" if str(file) not in str(error) else str(error))
    return rows, refused


def _text(path: Path, text: str) -> Path:
    path.write_text(text, encoding="utf-8", newline="")
    return path
