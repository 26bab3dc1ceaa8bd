"""The session file as it is written: one amplifier's runs, readings and raw captures, appended and never rewritten.

It is saved at every moment: each reading is committed with its raw capture. When the disk takes no more the measurement
goes on, and `trouble` says what happened.
"""

import contextlib
import hashlib
import json
import threading
from collections.abc import Mapping, Sequence
from concurrent.futures import Future
from pathlib import Path
from typing import Any, Self

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.device import DeviceUnderTest
from wattproof.core.errors import WattproofError
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.core.signal import Capture
from wattproof.procedures.evidence import evidence
from wattproof.procedures.power_rows import Row
from wattproof.procedures.requests import Kept, Said
from wattproof.store.connection import close_as_one_file, open_for_appending
from wattproof.store.samples import encoded
from wattproof.store.schema import SUFFIX
from wattproof.store.session_values import (
    BenchFacts,
    Keeping,
    Kind,
    RunEnding,
    RunFacts,
    StoredReading,
    StoredSamples,
    Stretch,
    plan_of,
)
from wattproof.store.stretches import Coverage, Gathered
from wattproof.store.trouble import STORE_ERRORS, explained
from wattproof.store.values import canonical, structured, unstructured
from wattproof.store.versions import versions
from wattproof.store.writer import Entry, Writer


class SessionFile:
    """A session file open for appending; no other program can open it meanwhile. Any thread may call its methods."""

    def __init__(self, path: Path) -> None:
        """Open a session file, made new where there is none.

        Raises:
            WrongUseError: the line names the file and the way out.
        """
        self.path = path.with_name(path.name + SUFFIX) if not path.suffix else path
        self._connection = open_for_appending(self.path)
        try:
            self._writer = Writer(self._connection, self.path)
        except STORE_ERRORS as error:
            self._connection.close()
            raise explained(self.path, error) from error
        self._runs: list[RunLog] = []

    def __enter__(self) -> Self:
        """Return itself."""
        return self

    def __exit__(self, *_: object) -> None:
        """Close."""
        self.close()

    @property
    def trouble(self) -> str:
        """Why nothing is written any more, in one sentence; empty while all is well."""
        return self._writer.trouble

    @property
    def head(self) -> str:
        """The hash of the last record: whoever has it can tell whether anything was changed since."""
        return self._writer.head

    @property
    def size_bytes(self) -> int:
        """How much room the file takes, its log included."""
        files = (self.path, self.path.with_name(self.path.name + "-wal"))
        return sum(file.stat().st_size for file in files if file.exists())

    def describe(self, device: DeviceUnderTest) -> None:
        """Say what is tested; the last word counts, the earlier ones stay.

        Raises:
            WrongUseError: it could not be written.
        """
        body = unstructured(device)
        if canonical(body) != self._last_body(Kind.DEVICE):
            self._writer.append(Entry(Kind.DEVICE, None, body))

    def device(self) -> DeviceUnderTest | None:
        """Return what is tested, as it was said last, or None."""
        body = self._last_body(Kind.DEVICE)
        return structured(json.loads(body), DeviceUnderTest) if body else None

    def add_photo(self, content: bytes, name: str) -> None:
        """Keep a photo of the device, as its file is.

        Raises:
            WrongUseError: it could not be written.
        """
        sha256 = hashlib.sha256(content).hexdigest()
        self._writer.append(Entry(Kind.PHOTO, None, {"name": name, "sha256": sha256, "bytes": len(content)}, content))

    def note(self, text: str, run: "RunLog | None" = None) -> None:
        """Write down a remark, on a run or on the session.

        Raises:
            WrongUseError: it could not be written.
        """
        self._writer.append(Entry(Kind.NOTE, None if run is None else run.seq, {"text": text}))

    def begin_run(  # noqa: PLR0913 - a run begins with all of these
        self,
        procedure: str,
        settings: object,
        rig: Rig,
        calibration: Calibration,
        bench: BenchFacts,
        *,
        rows: Sequence[Row] = (),
        keeping: Keeping = Keeping.ALL,
    ) -> "RunLog":
        """Begin a run and return where its readings go.

        Raises:
            WrongUseError: it could not be written.
        """
        facts = RunFacts(
            procedure=procedure,
            settings=_as_mapping(settings),
            rows=tuple(rows),
            rig=rig,
            calibration=self._calibration(calibration),
            bench=bench,
            versions=versions(),
            keeping=keeping,
        )
        log = RunLog(self._writer, self._writer.append(Entry(Kind.RUN, None, unstructured(facts))), facts)
        self._runs.append(log)
        return log

    def close(self) -> None:
        """Write what waits, end runs that nobody ended, and leave one file behind.

        Raises:
            WrongUseError: the disk does not take it; what was kept before stands.
        """
        for log in self._runs:
            if not log.ended:
                log.end(Ending.FAILED, "the program closed the session before the run had ended")
        self._writer.stop()
        close_as_one_file(self._connection, self.path)

    def _last_body(self, kind: Kind) -> str:
        rows = self._writer.ask(
            "SELECT body FROM record WHERE run IS NULL AND kind = ? ORDER BY number DESC LIMIT 1", (kind,)
        )
        return rows[0][0] if rows else ""

    def _calibration(self, calibration: Calibration) -> int:
        """Return the seq of a calibration's record; the one before is taken where it is the same."""
        body = unstructured(calibration)
        question = "SELECT seq, body FROM record WHERE run IS NULL AND kind = ? ORDER BY number DESC LIMIT 1"
        last = self._writer.ask(question, (Kind.CALIBRATION,))
        if last and last[0][1] == canonical(body):
            return int(last[0][0])
        return self._writer.append(Entry(Kind.CALIBRATION, None, body))


class RunLog:
    """Where one run's readings go. `keep` waits for no disk, `end` does."""

    def __init__(self, writer: Writer, seq: int, facts: RunFacts) -> None:
        self.seq = seq
        self.ended = False
        self.readings = 0
        self._writer, self._facts = writer, facts
        self._coverage = Coverage()
        self._kept: list[tuple[Kept, Stretch]] = []  # what the choice of captures is made from at the end
        self._waiting: list[tuple[Kept, Capture, Stretch]] = []
        self._lock = threading.Lock()

    def keep(self, kept: Kept, raw: Capture, block: Stretch) -> "Future[int]":
        """Keep a reading with its raw capture, of which `block` is what was read: one transaction, soon.

        The future is done once both are on the disk. Where the file takes no more, nothing is kept, and the session's
        `trouble` says so too.
        """
        with self._lock:
            self._waiting.append((kept, raw, block))
            if self._facts.keeping is Keeping.POINTS:
                self._kept.append((kept, Stretch(raw.first_frame, raw.frames)))
        return self._writer.post(self._gathered)

    def find(self, said: Said) -> None:
        """Keep what the procedure found out."""
        self._writer.post(lambda: [Entry(Kind.FINDING, self.seq, unstructured(said))])

    def end(self, ending: Ending, why: str = "") -> None:
        """Write how the run ended, and let go of the raw captures that its procedure does not keep.

        Where the file takes no more, the session's `trouble` says so.
        """
        self.ended = True
        with contextlib.suppress(WattproofError):
            self._writer.post(lambda: [self._ending(ending, why)]).result()
            if self._facts.keeping is Keeping.POINTS:
                self._release()

    def _release(self) -> None:
        """Let go of the captures that the statement does not rest on; which ones is written down."""
        plan = plan_of(self._facts)
        needed = evidence(plan, self._facts.rows, [kept for kept, _ in self._kept])
        wanted = [self._kept[index][1] for index in needed]
        stored = self._writer.ask("SELECT seq, body FROM record WHERE run = ? AND kind = ?", (self.seq, Kind.CAPTURE))
        captures = [(seq, structured(json.loads(body), StoredSamples).stretch) for seq, body in stored]
        gone = tuple(seq for seq, stretch in captures if not any(stretch.overlaps(each) for each in wanted))
        if gone:
            self._writer.append(Entry(Kind.RELEASED, self.seq, {"captures": list(gone)}, drops=gone))

    def _ending(self, ending: Ending, why: str) -> Entry:
        return Entry(Kind.ENDING, self.seq, unstructured(RunEnding(ending, why, self.readings)))

    def _gathered(self) -> list[Entry]:
        """Return all that waits, in the writer's thread: raw samples first, each frame once, then the readings."""
        with self._lock:
            waiting, self._waiting = self._waiting, []
        gathered = Gathered(self._coverage)
        for _, raw, _ in waiting:
            gathered.take(raw)
        rate_hz = self._facts.bench.rate_hz
        entries = []
        for first_frame, samples in gathered.stretches():
            coding, content = encoded(samples, rate_hz)
            sha256 = hashlib.sha256(content).hexdigest()
            body = StoredSamples(first_frame, samples.shape[0], samples.shape[1], rate_hz, coding, sha256, len(content))
            entries.append(Entry(Kind.CAPTURE, self.seq, unstructured(body), content))
        for kept, raw, block in waiting:
            stretch = Stretch(raw.first_frame, raw.frames)
            stored = StoredReading(kept, block, stretch, raw.gaps, raw.overloads)
            entries.append(Entry(Kind.READING, self.seq, unstructured(stored)))
        self.readings += len(waiting)
        return entries


def _as_mapping(settings: object) -> Mapping[str, Any]:
    content: Mapping[str, Any] = unstructured(settings) if attrs.has(type(settings)) else dict(settings)  # type: ignore[call-overload]  # a mapping it is then
    return content
