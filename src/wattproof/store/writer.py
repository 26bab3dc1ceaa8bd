"""Writes to a session file in a thread of its own: what belongs together is one transaction."""

import sqlite3
import threading
from collections.abc import Callable, Sequence
from concurrent.futures import Future
from datetime import UTC, datetime
from pathlib import Path
from queue import Queue
from typing import Any

import attrs

from wattproof.core.errors import WrongUseError
from wattproof.store.chain import START, link
from wattproof.store.trouble import STORE_ERRORS, explained
from wattproof.store.values import canonical

MOST_WAITING = 64  # jobs: some hundred megabytes of captures; beyond that the disk holds the measurement back
MOST_IN_ONE = 16  # jobs that one transaction takes together, so that a slow disk catches up


@attrs.frozen(eq=False)
class Entry:
    """What a record is made of: its kind, its run (the seq of that), its body, and bytes that it names."""

    kind: str
    run: int | None
    body: object
    content: bytes | None = None
    drops: tuple[int, ...] = ()  # seqs of records whose bytes go


class Writer:
    """Appends entries to the chain. After a failure it writes no more: `trouble` says why; what was kept stands."""

    def __init__(self, connection: sqlite3.Connection, path: Path) -> None:
        self.trouble = ""
        self._connection, self._path = connection, path
        self._using = threading.Lock()
        self._seq, self._head = 0, START
        self._numbers: dict[tuple[int | None, str], int] = {}
        self._load()
        self._jobs: Queue[tuple[Callable[[], Sequence[Entry]], Future[int]] | None] = Queue(MOST_WAITING)
        self._thread = threading.Thread(target=self._live, name="wattproof-store", daemon=True)
        self._thread.start()

    @property
    def head(self) -> str:
        """The hash of the last record that was written."""
        return self._head

    def post(self, make: Callable[[], Sequence[Entry]]) -> "Future[int]":
        """Have entries made and written by the thread, in one transaction; the future is the last one's seq."""
        done: Future[int] = Future()
        self._jobs.put((make, done))
        return done

    def append(self, *entries: Entry) -> int:
        """Write entries in one transaction, wait for it, and return the seq of the last.

        Raises:
            WrongUseError: they could not be written.
        """
        return self.post(lambda: entries).result()

    def ask(self, sql: str, values: Sequence[Any] = ()) -> list[Any]:
        """Return the rows of a question to the file, from any thread."""
        with self._using:
            return self._connection.execute(sql, values).fetchall()

    def stop(self) -> None:
        """Write what waits and end the thread."""
        if self._thread.is_alive():
            self._jobs.put(None)
            self._thread.join()

    def _load(self) -> None:
        last = self._connection.execute("SELECT seq, hash FROM record ORDER BY seq DESC LIMIT 1").fetchone()
        if last is not None:
            self._seq, self._head = last

    def _live(self) -> None:
        while (job := self._jobs.get()) is not None:
            jobs = [job]
            while len(jobs) < MOST_IN_ONE and not self._jobs.empty():
                further = self._jobs.get()
                if further is None:
                    self._write(jobs)
                    return
                jobs.append(further)
            self._write(jobs)

    def _write(self, jobs: Sequence[tuple[Callable[[], Sequence[Entry]], "Future[int]"]]) -> None:
        """Write jobs in one transaction; where it fails none of them was written."""
        before = self._seq, self._head, dict(self._numbers)
        try:
            self._require_sound()
            with self._using:
                self._connection.execute("BEGIN IMMEDIATE")
                try:
                    seqs = [self._written(make()) for make, _ in jobs]
                    self._connection.execute("COMMIT")
                except BaseException:
                    if self._connection.in_transaction:
                        self._connection.execute("ROLLBACK")
                    raise
        except Exception as error:  # noqa: BLE001 - whatever breaks, whoever waits is told, and the measurement goes on
            self._seq, self._head, self._numbers = before
            told = explained(self._path, error) if isinstance(error, STORE_ERRORS) else error
            self.trouble = self.trouble or str(told)
            for _, done in jobs:
                done.set_exception(told)
            return
        for (_, done), seq in zip(jobs, seqs, strict=True):
            done.set_result(seq)

    def _require_sound(self) -> None:
        if self.trouble:
            raise WrongUseError(self.trouble)

    def _written(self, entries: Sequence[Entry]) -> int:
        for entry in entries:
            self._append(entry)
        return self._seq

    def _append(self, entry: Entry) -> None:
        seq, body = self._seq + 1, canonical(entry.body)
        number = self._number(entry.run, entry.kind)
        at = datetime.now(UTC).isoformat(timespec="milliseconds")
        made = link(self._head, seq, entry.kind, entry.run, number, at, body)
        row = (seq, entry.kind, entry.run, number, at, body, made)
        self._connection.execute("INSERT INTO record VALUES (?, ?, ?, ?, ?, ?, ?)", row)
        if entry.content is not None:
            self._connection.execute("INSERT INTO content VALUES (?, ?)", (seq, entry.content))
        for dropped in entry.drops:
            self._connection.execute("DELETE FROM content WHERE seq = ?", (dropped,))
        self._seq, self._head = seq, made

    def _number(self, run: int | None, kind: str) -> int:
        """Return the next number of a kind within its run, from 1."""
        key = run, kind
        if key not in self._numbers:
            question = "SELECT max(number) FROM record WHERE run IS ? AND kind = ?"
            self._numbers[key] = self._connection.execute(question, key).fetchone()[0] or 0
        self._numbers[key] += 1
        return self._numbers[key]
