"""The session file as it is read: its device, runs, readings and raw captures, a line or a run at a time."""

import json
from collections.abc import Callable, Iterator, Sequence
from functools import cached_property
from pathlib import Path
from typing import Any, Self

import attrs
import numpy as np

from wattproof.core.calibration import Calibration
from wattproof.core.device import DeviceUnderTest
from wattproof.core.signal import Capture, Samples
from wattproof.procedures.again import Conditions
from wattproof.procedures.requests import Kept, Said
from wattproof.store.chain import Record
from wattproof.store.connection import open_for_reading
from wattproof.store.samples import Coding, decoded
from wattproof.store.session_values import Kind, RunEnding, RunFacts, StoredReading, StoredSamples, Stretch, plan_of
from wattproof.store.trouble import STORE_ERRORS, explained
from wattproof.store.values import structured

_COLUMNS = "seq, kind, run, number, at, body, hash"
_ENDLESS = 2**62
_DECODED_KEPT = 8  # stretches that are held decoded: blocks that overlap name the same ones


class MissingCaptureError(ValueError):
    """Frames that a reading names are not in the file, or are not what they were."""


@attrs.frozen(eq=False)
class Photo:
    """A picture of the device, as its file was."""

    name: str
    content: bytes


class SessionReader:
    """A session file that is open for reading."""

    def __init__(self, path: Path) -> None:
        """Open a session file.

        Raises:
            WrongUseError: the line names the file and the way out.
        """
        self.path = path
        self._connection = open_for_reading(path)

    def __enter__(self) -> Self:
        """Return itself."""
        return self

    def __exit__(self, *_: object) -> None:
        """Close."""
        self.close()

    def close(self) -> None:
        """Let go of the file."""
        self._connection.close()

    def ask(self, sql: str, values: Sequence[Any] = ()) -> list[Any]:
        """Return the rows of a question to the file.

        Raises:
            DamagedError: the file is damaged.
            WrongUseError: whatever else keeps it from being read.
        """
        try:
            return self._connection.execute(sql, values).fetchall()
        except STORE_ERRORS as error:
            raise explained(self.path, error) from error

    @property
    def head(self) -> str:
        """The hash of the last record; empty where there is none."""
        rows = self.ask("SELECT hash FROM record ORDER BY seq DESC LIMIT 1")
        return str(rows[0][0]) if rows else ""

    @property
    def device(self) -> DeviceUnderTest:
        """What was tested, as it was said last."""
        rows = self._of_kind(Kind.DEVICE)
        return structured(rows[-1].content, DeviceUnderTest) if rows else DeviceUnderTest()

    @property
    def begun_at(self) -> str:
        """When the session was begun, ISO 8601 in UTC."""
        rows = self._of_kind(Kind.SESSION)
        return rows[0].at if rows else ""

    @property
    def notes(self) -> tuple[str, ...]:
        """The remarks on the session and on its runs, in order."""
        rows = self.ask("SELECT body FROM record WHERE kind = ? ORDER BY seq", (Kind.NOTE,))
        return tuple(str(json.loads(body)["text"]) for (body,) in rows)

    @property
    def photos(self) -> tuple[Photo, ...]:
        """The pictures of the device."""
        return tuple(Photo(row.content["name"], self._bytes(row.seq)) for row in self._of_kind(Kind.PHOTO))

    @property
    def runs(self) -> tuple["StoredRun", ...]:
        """The runs in order."""
        return tuple(StoredRun(self, row) for row in self._of_kind(Kind.RUN))

    def records(self) -> Iterator[Record]:
        """Yield every record in order.

        Raises:
            DamagedError: the file is damaged.
        """
        try:
            for row in self._connection.execute(f"SELECT {_COLUMNS} FROM record ORDER BY seq"):  # noqa: S608 - a constant
                yield Record(*row)
        except STORE_ERRORS as error:
            raise explained(self.path, error) from error

    def content(self, seq: int) -> bytes | None:
        """Return the bytes that belong to a record, or None where there are none."""
        rows = self.ask("SELECT bytes FROM content WHERE seq = ?", (seq,))
        return rows[0][0] if rows else None

    def calibration(self, seq: int) -> Calibration:
        """Return the calibration of a record."""
        rows = self.ask("SELECT body FROM record WHERE seq = ? AND kind = ?", (seq, Kind.CALIBRATION))
        if not rows:
            raise MissingCaptureError(f"record {seq}, a calibration, is missing")
        return structured(json.loads(rows[0][0]), Calibration)

    def of_run(self, run: int, kind: Kind, first: int = 0, end: int = _ENDLESS) -> list[Record]:
        """Return the records of one kind of a run, in order, from place `first` (from 0) up to, without, `end`."""
        condition = "run = ? AND kind = ? AND number > ? AND number <= ? ORDER BY number"
        question = f"SELECT {_COLUMNS} FROM record WHERE {condition}"  # noqa: S608 - constants
        return [Record(*row) for row in self.ask(question, (run, kind, first, end))]

    def last_number(self, run: int, kind: Kind) -> int:
        """Return how many records of a kind a run has, from the number of the last."""
        rows = self.ask("SELECT max(number) FROM record WHERE run = ? AND kind = ?", (run, kind))
        return int(rows[0][0] or 0)

    def _of_kind(self, kind: Kind) -> list[Record]:
        question = f"SELECT {_COLUMNS} FROM record WHERE run IS NULL AND kind = ? ORDER BY number"  # noqa: S608 - a constant
        return [Record(*row) for row in self.ask(question, (kind,))]

    def _bytes(self, seq: int) -> bytes:
        content = self.content(seq)
        if content is None:
            raise MissingCaptureError(f"the bytes of record {seq} are missing")
        return content


class StoredRun:
    """One run of a session."""

    def __init__(self, reader: SessionReader, record: Record) -> None:
        self._reader = reader
        self.seq, self.number, self.at = record.seq, record.number, record.at
        self.facts: RunFacts = structured(record.content, RunFacts)

    @cached_property
    def ending(self) -> RunEnding | None:
        """How it ended; None where the program died before."""
        rows = self._reader.of_run(self.seq, Kind.ENDING)
        return structured(rows[-1].content, RunEnding) if rows else None

    @property
    def reading_count(self) -> int:
        """How many readings were kept."""
        return self._reader.last_number(self.seq, Kind.READING)

    @cached_property
    def conditions(self) -> Conditions:
        """What it was measured under.

        Raises:
            WrongUseError: its procedure is not known here.
        """
        facts, bench = self.facts, self.facts.bench
        calibration = self._reader.calibration(facts.calibration)
        return Conditions(plan_of(facts), facts.rows, facts.rig, calibration, bench.rate_hz, bench.inputs)

    @cached_property
    def readings(self) -> tuple[StoredReading, ...]:
        """All readings in the order in which they were kept."""
        return tuple(structured(row.content, StoredReading) for row in self._reader.of_run(self.seq, Kind.READING))

    def readings_from(self, first: int, end: int) -> Iterator[StoredReading]:
        """Yield the readings from place `first` (counted from 0) up to, without, place `end`."""
        for row in self._reader.of_run(self.seq, Kind.READING, first, end):
            yield structured(row.content, StoredReading)

    @cached_property
    def findings(self) -> tuple[Said, ...]:
        """What the procedure found out."""
        return tuple(structured(row.content, Said) for row in self._reader.of_run(self.seq, Kind.FINDING))

    @property
    def records(self) -> tuple[Kept | Said, ...]:
        """What a statement is concluded from."""
        return (*(stored.kept for stored in self.readings), *self.findings)

    @cached_property
    def samples(self) -> "StoredCaptures":
        """The raw samples of the run."""
        return StoredCaptures(self._reader.of_run(self.seq, Kind.CAPTURE), self._released(), self._reader.content)

    def _released(self) -> frozenset[int]:
        rows = self._reader.of_run(self.seq, Kind.RELEASED)
        return frozenset(seq for row in rows for seq in row.content["captures"])


class StoredCaptures:
    """The raw samples of one run, put together from the stretches that the file holds."""

    def __init__(
        self, records: Sequence[Record], released: frozenset[int], content: Callable[[int], bytes | None]
    ) -> None:
        self._stored = [(row.seq, structured(row.content, StoredSamples)) for row in records]
        self._released, self._content = released, content
        self._decoded: dict[int, Samples] = {}

    def let_go(self, stretch: Stretch) -> bool:
        """Whether frames of a stretch are not there by choice of the run."""
        return any(seq in self._released and each.stretch.overlaps(stretch) for seq, each in self._stored)

    def capture(self, reading: StoredReading, stretch: Stretch) -> Capture:
        """Return frames of a reading's raw capture as they were captured: `reading.block`, or `reading.raw`.

        Raises:
            MissingCaptureError: some are missing or cannot be decoded.
        """
        parts, at, rate_hz = [], stretch.first_frame, 0.0
        for seq, stored in self._at(stretch):
            if stored.first_frame <= at < stored.stretch.end_frame:
                rate_hz = stored.rate_hz
                end = min(stored.stretch.end_frame, stretch.end_frame)
                parts.append(self._samples(seq, stored)[at - stored.first_frame : end - stored.first_frame])
                at = end
        if at < stretch.end_frame or not parts:
            raise MissingCaptureError(f"the raw capture of frames {at} to {stretch.end_frame} is missing")
        samples = np.ascontiguousarray(np.concatenate(parts))
        return Capture(samples, rate_hz, stretch.first_frame, reading.gaps, reading.overloads)

    def _at(self, stretch: Stretch) -> list[tuple[int, StoredSamples]]:
        found = [pair for pair in self._stored if pair[1].stretch.overlaps(stretch)]
        return sorted(found, key=lambda pair: pair[1].first_frame)

    def _samples(self, seq: int, stored: StoredSamples) -> Samples:
        if seq not in self._decoded:
            content = self._content(seq)
            if content is None:
                raise MissingCaptureError(f"the raw capture of record {seq} is missing")
            try:
                found = decoded(Coding(stored.coding), content, stored.frames, stored.channels)
            except ValueError as error:
                raise MissingCaptureError(f"the raw capture of record {seq}: {error}") from error
            while len(self._decoded) >= _DECODED_KEPT:
                del self._decoded[next(iter(self._decoded))]
            self._decoded[seq] = found
        return self._decoded[seq]
