"""Brings a session file of an earlier version up to today's: a copy is made first, each step is one transaction."""

import sqlite3
from collections.abc import Callable, Mapping
from pathlib import Path
from types import MappingProxyType

from wattproof.core.errors import WrongUseError
from wattproof.store.schema import VERSION

Step = Callable[[sqlite3.Connection], None]
STEPS: Mapping[int, Step] = MappingProxyType({})  # version before the step: the step; version 1 is the first there is


def migrated(
    connection: sqlite3.Connection, path: Path, steps: Mapping[int, Step] = STEPS, to_version: int = VERSION
) -> Path | None:
    """Bring an open file up to a version and return the copy that was made before; None where nothing was to be done.

    The copy stands beside the file, named after its version. A step that fails leaves the file at the version before.

    Raises:
        WrongUseError: there is no step from the file's version.
        sqlite3.Error, OSError: the copy or a step failed.
    """
    version = connection.execute("PRAGMA user_version").fetchone()[0]
    if version == to_version:
        return None
    require_way(path, version, steps, to_version)
    copy = _copied(connection, path, version)
    step_up(connection, steps, to_version)
    return copy


def require_way(path: Path, version: int, steps: Mapping[int, Step] = STEPS, to_version: int = VERSION) -> None:
    """Accept a version from which steps lead to `to_version`.

    Raises:
        WrongUseError: one is missing.
    """
    if any(number not in steps for number in range(version, to_version)):
        raise WrongUseError(
            f"{path}: it is of version {version}, from which no way leads to {to_version}; update wattproof"
        )


def step_up(connection: sqlite3.Connection, steps: Mapping[int, Step] = STEPS, to_version: int = VERSION) -> None:
    """Bring an open file up to a version, one transaction a step.

    Raises:
        KeyError: there is no step from some version on the way.
        sqlite3.Error: a step failed.
    """
    version = connection.execute("PRAGMA user_version").fetchone()[0]
    for number in range(version, to_version):
        connection.execute("BEGIN IMMEDIATE")
        try:
            steps[number](connection)
            connection.execute(f"PRAGMA user_version = {number + 1}")
            connection.execute("COMMIT")
        except BaseException:
            connection.execute("ROLLBACK")
            raise


def _copied(connection: sqlite3.Connection, path: Path, version: int) -> Path:
    copy = path.with_name(f"{path.stem}.version-{version}{path.suffix}")
    number = 1
    while copy.exists():
        number += 1
        copy = path.with_name(f"{path.stem}.version-{version}-{number}{path.suffix}")
    target = sqlite3.connect(copy)
    try:
        connection.backup(target)
        target.execute("PRAGMA journal_mode = DELETE")
    finally:
        target.close()
    return copy
