"""What SQLite and the disk complain of, as one sentence that names the file and the way out."""

import sqlite3
from pathlib import Path

from wattproof.core.errors import WrongUseError


class DamagedError(WrongUseError):
    """A session file whose bytes are not what SQLite wrote; what else is wrong with it stays unknown."""


_STANDS = "what was kept before stands"
_WAYS = (
    (("full",), "the disk is full: {stands}; make room, then measure again"),
    (("readonly", "read-only"), "it is read-only: {stands}; make it writable, or give a file in another folder"),
    (("locked", "busy"), "another program has it open; close it there, or give another file"),
    (
        ("locking protocol", "disk i/o error", "i/o"),
        "its disk or share fails or does not lock files: {stands}; copy the session to a local disk and go on there",
    ),
    (("unable to open",), "it cannot be opened or written there; check the folder, or give another one"),
)
_DAMAGED = ("malformed", "not a database", "file is encrypted", "corrupt")


def explained(path: Path, error: Exception) -> WrongUseError:
    """Return the error to show for one that SQLite or the system raised on a session file."""
    said = (error.strerror or str(error)) if isinstance(error, OSError) else str(error)
    low = said.lower()
    if any(word in low for word in _DAMAGED):
        return DamagedError(
            f"{path}: the file is damaged ({said}); nothing was changed in it: work with an earlier copy of it"
        )
    for words, way in _WAYS:
        if any(word in low for word in words):
            return WrongUseError(f"{path}: {way.format(stands=_STANDS)}")
    return WrongUseError(f"{path}: {said}; {_STANDS}: give another file")


STORE_ERRORS = (sqlite3.Error, OSError)
