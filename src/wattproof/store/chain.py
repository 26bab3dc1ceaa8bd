"""The chain of records: each hash covers the one before, so that none is removed, moved or edited unseen."""

import hashlib
import json
from collections.abc import Iterable, Iterator
from typing import Any

import attrs

START = "0" * 64  # what the first record has before it


@attrs.frozen
class Record:
    """One line of the session. `body` is canonical JSON; `run` is the seq of the run it belongs to, if any."""

    seq: int
    kind: str
    run: int | None
    number: int
    at: str
    body: str
    hash: str

    @property
    def content(self) -> Any:  # noqa: ANN401 - whatever JSON holds
        """What the body says."""
        return json.loads(self.body)


@attrs.frozen
class Fault:
    """Something that is not as it was written: at which record, and what, in one sentence."""

    seq: int
    why: str


def link(previous: str, seq: int, kind: str, run: int | None, number: int, at: str, body: str) -> str:  # noqa: PLR0913, PLR0917 - what it covers
    """Return the hash of a record: SHA-256 of these as lines of UTF-8 text, hexadecimal; no run is an empty line."""
    lines = (previous, str(seq), kind, "" if run is None else str(run), str(number), at, body)
    return hashlib.sha256("\n".join(lines).encode()).hexdigest()


def faults_in(records: Iterable[Record]) -> Iterator[Fault]:
    """Yield where a chain is broken; after a break it is followed on from what stands there."""
    previous, expected = START, 1
    for record in records:
        if record.seq != expected:
            missing = (
                f"record {expected} is missing" if record.seq > expected else f"record {record.seq} is out of order"
            )
            yield Fault(record.seq, missing)
        made = link(previous, record.seq, record.kind, record.run, record.number, record.at, record.body)
        if made != record.hash and record.seq == expected:
            yield Fault(record.seq, f"record {record.seq} ({record.kind}) is not as it was written")
        previous, expected = record.hash, record.seq + 1
    if expected == 1:
        yield Fault(0, "there is no record at all")
