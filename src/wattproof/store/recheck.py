"""Checks a session again: file, chain and captures as written, and every reading once more from its raw samples."""

import hashlib
import json
import math
import multiprocessing
import os
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import attrs

from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading, State
from wattproof.core.rechecked import Difference, Rechecked
from wattproof.procedures.again import Again
from wattproof.store.chain import Fault, Record, faults_in
from wattproof.store.schema import SCHEMA
from wattproof.store.session_reader import MissingCaptureError, SessionReader, StoredRun
from wattproof.store.session_values import Kind, StoredReading
from wattproof.store.trouble import DamagedError

OF_UNCERTAINTY = 0.02  # of its u by which a figure may differ: another order of additions gives a few thousandths
RELATIVE = 1e-9  # and of the figure itself, where u is nearly nothing; float64 holds 1e-16
U_RELATIVE = 0.02  # of an uncertainty, which follows the noise
WORTH_A_PROCESS = 150  # readings; a process starts in half a second, in which one reads that many
_FIGURES = (
    "fundamental_hz",
    "fundamental_fs",
    "level_fs",
    "level_vrms",
    "power_w",
    "dc_fs",
    "thdn",
    "thd",
    "noise",
    "hum",
)


@attrs.frozen
class _Part:
    """Some readings of one run, for one process."""

    path: str
    run: int
    first: int
    end: int


@attrs.frozen
class _Found:
    reproduced: int = 0
    let_go: int = 0
    unread: int = 0
    largest: float = 0.0
    differences: tuple[Difference, ...] = ()


def recheck(path: Path, expected: str = "", workers: int | None = None) -> Rechecked:
    """Check one session; `workers` processes share the readings (None: one for each core).

    Raises:
        WrongUseError: no such file, in use, or from a newer program. A damaged one is an outcome.
    """
    try:
        with SessionReader(path) as reader:
            faults = list(written_wrong(reader))
            head = reader.head
            counts = [(run.number, run.reading_count) for run in reader.runs] if not _unreadable(faults) else []
    except DamagedError as error:
        return Rechecked(str(path), "", expected, 0, 0, 0, 0, 0.0, (str(error),), ())
    except Exception as error:
        if isinstance(error, WrongUseError):
            raise
        return Rechecked(str(path), "", expected, 0, 0, 0, 0, 0.0, (*faults, f"a run cannot be read: {error}"), ())
    if expected and head != expected.strip().lower():
        faults.append(f"the chain ends in {head}, not in the hash that is expected: records were cut off or rewritten")
    found = list(_made_again(str(path), counts, workers or os.cpu_count() or 1))
    return Rechecked(
        path=str(path),
        head=head,
        expected=expected,
        readings=sum(count for _, count in counts),
        reproduced=sum(each.reproduced for each in found),
        let_go=sum(each.let_go for each in found),
        unread=sum(each.unread for each in found),
        largest=max((each.largest for each in found), default=0.0),
        faults=tuple(faults),
        differences=tuple(difference for each in found for difference in each.differences),
    )


def _unreadable(faults: Sequence[str]) -> bool:
    return any(_DAMAGED in fault for fault in faults)


_DAMAGED = "the file is damaged"


def written_wrong(reader: SessionReader) -> Iterator[str]:
    """Yield what in a session is not as it was written: damaged pages, broken links, captures of other bytes.

    Raises:
        DamagedError: so damaged that it cannot be read on.
    """
    problems = [row[0] for row in reader.ask("PRAGMA integrity_check") if row[0] != "ok"]
    yield from (f"{_DAMAGED}: {problem}" for problem in problems[:3])
    schema = {row[0] for row in reader.ask("SELECT sql FROM sqlite_schema WHERE sql IS NOT NULL")}
    if schema != set(SCHEMA):
        yield "the tables are not those of a session: somebody changed them"
    if problems:
        return
    for row in reader.ask("PRAGMA foreign_key_check"):
        yield f"a row of the table {row[0]} belongs to a record that is not there"
    yield from (fault.why for fault in _chain_and_contents(reader))


def _chain_and_contents(reader: SessionReader) -> Iterator[Fault]:
    """Yield faults of the chain and of the bytes that records name. One pass over the file."""
    named: dict[int, Record] = {}
    released: set[int] = set()

    def watched() -> Iterator[Record]:
        for record in reader.records():
            if record.kind in {Kind.CAPTURE, Kind.PHOTO}:
                named[record.seq] = record
            elif record.kind == Kind.RELEASED:
                released.update(_captures_of(record))
            yield record

    yield from faults_in(watched())
    there = {row[0] for row in reader.ask("SELECT seq FROM content")}
    yield from (Fault(seq, f"record {seq} has bytes that no record names") for seq in sorted(there - named.keys()))
    for seq, record in named.items():
        if seq not in there:
            if seq not in released:
                yield Fault(seq, f"the {record.kind} of record {seq} is missing")
            continue
        content = reader.content(seq) or b""
        if f'"{hashlib.sha256(content).hexdigest()}"' not in record.body:
            yield Fault(seq, f"the {record.kind} of record {seq} is not as it was captured")


def _captures_of(record: Record) -> list[int]:
    try:
        return [int(seq) for seq in json.loads(record.body)["captures"]]
    except (ValueError, KeyError, TypeError):  # tampered with: the chain tells
        return []


def _made_again(path: str, counts: Sequence[tuple[int, int]], workers: int) -> Iterator[_Found]:
    whole = sum(count for _, count in counts)
    workers = max(1, min(workers, whole // WORTH_A_PROCESS))
    size = max(1, math.ceil(whole / (workers * 4))) if workers > 1 else max(1, whole)
    parts = [
        _Part(path, run, first, min(first + size, count)) for run, count in counts for first in range(0, count, size)
    ]
    if workers == 1:
        yield from map(_part_again, parts)
        return
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(workers, mp_context=context) as pool:
        yield from pool.map(_part_again, parts)


def _part_again(part: _Part) -> _Found:
    with SessionReader(Path(part.path)) as reader:
        run = next(each for each in reader.runs if each.number == part.run)
        try:
            again, readings = Again(run.conditions), run.readings_from(part.first, part.end)
        except Exception as error:  # noqa: BLE001 - as above: told as a difference
            return _Found(differences=(Difference(part.run, part.first + 1, f"the run cannot be read: {error}"),))
        each = [_again(run, again, part.first + index + 1, stored) for index, stored in enumerate(readings)]
    return _Found(
        sum(one.reproduced for one in each),
        sum(one.let_go for one in each),
        sum(one.unread for one in each),
        max((one.largest for one in each), default=0.0),
        tuple(difference for one in each for difference in one.differences),
    )


def _again(run: StoredRun, again: Again, number: int, stored: StoredReading) -> _Found:
    """Make one reading again and compare it."""
    was = stored.kept.reading
    if was.state is State.UNSTEADY:
        return _Found(unread=1)
    try:
        now = again.read(stored.kept, run.samples.capture(stored, stored.block))
    except MissingCaptureError as error:
        if run.samples.let_go(stored.block):
            return _Found(let_go=1)
        return _Found(differences=(Difference(run.number, number, str(error)),))
    except Exception as error:  # noqa: BLE001 - as above
        return _Found(differences=(Difference(run.number, number, f"it cannot be made again: {error}"),))
    largest, why = compared(was, now)
    if why:
        return _Found(largest=largest, differences=(Difference(run.number, number, why),))
    return _Found(reproduced=1, largest=largest)


def compared(was: Reading, now: Reading) -> tuple[float, str]:
    """Return the largest difference of a figure in units of its uncertainty, and what differs beyond the tolerances."""
    if was.state is not now.state:
        return 0.0, f"it was '{was.state}' and is now '{now.state}'"
    pairs = [(name, getattr(was, name), getattr(now, name)) for name in _FIGURES]
    orders = {harmonic.order: harmonic.ratio for harmonic in now.harmonics}
    pairs += [(f"harmonic {each.order}", each.ratio, orders.get(each.order)) for each in was.harmonics]
    largest, wrong = 0.0, []
    for name, before, after in pairs:
        apart, why = _apart(before, after)
        largest = max(largest, apart)
        if why:
            wrong.append(f"{name} {why}")
    if was.span != now.span:
        wrong.append("its span is another")
    return largest, "; ".join(wrong[:4])


def _apart(before: Quantity | None, after: Quantity | None) -> tuple[float, str]:
    if before is None or after is None:
        return 0.0, "" if before is after else "is stated in one of both only"
    apart = abs(before.value - after.value)
    in_u = apart / before.u if before.u > 0.0 else 0.0
    if apart > OF_UNCERTAINTY * before.u + RELATIVE * abs(before.value):
        return in_u, f"was {before.value:.9g} and is now {after.value:.9g} ({in_u:.2g} of its uncertainty)"
    if abs(before.u - after.u) > U_RELATIVE * before.u:
        return in_u, f"had an uncertainty of {before.u:.4g} and has now {after.u:.4g}"
    return (in_u if apart > RELATIVE * abs(before.value) else 0.0), ""
