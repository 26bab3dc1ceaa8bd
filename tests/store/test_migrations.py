"""An older file is brought up step by step, a copy is made first, and a step that fails changes nothing."""

import sqlite3
from pathlib import Path
from types import MappingProxyType

import pytest

from tests.store.made import made_session
from wattproof.core.errors import WrongUseError
from wattproof.store.migrations import STEPS, migrated
from wattproof.store.recheck import recheck
from wattproof.store.schema import VERSION
from wattproof.store.session_file import SessionFile
from wattproof.store.session_reader import SessionReader


def _without_view(path: Path) -> None:
    """Make of a session what a version 0 would have been: without the view."""
    connection = sqlite3.connect(path, isolation_level=None)
    connection.execute("DROP VIEW reading")
    connection.execute("PRAGMA user_version = 0")
    connection.execute("VACUUM")
    connection.close()


def _with_view(connection: sqlite3.Connection) -> None:
    from wattproof.store.schema import SCHEMA  # noqa: PLC0415 - the step is the test's own

    connection.execute(SCHEMA[-1])


def _fails(connection: sqlite3.Connection) -> None:
    connection.execute("DELETE FROM record")
    raise sqlite3.OperationalError("planted")


@pytest.fixture
def old(tmp_path: Path) -> Path:
    path = tmp_path / "old.wattproof"
    made_session(path, 2)
    _without_view(path)
    return path


def _open(path: Path) -> sqlite3.Connection:
    return sqlite3.connect(path, isolation_level=None)


def test_an_old_file_is_brought_up_with_a_copy_beside_it(old: Path) -> None:
    before = old.read_bytes()
    connection = _open(old)
    copy = migrated(connection, old, {0: _with_view})
    connection.close()
    assert copy == old.with_name("old.version-0.wattproof")
    assert _open(copy).execute("PRAGMA user_version").fetchone() == (0,)
    assert _open(copy).execute("SELECT group_concat(hash) FROM record").fetchone() is not None
    assert recheck(old, workers=1).reproduced == 2
    assert old.read_bytes() != before


def test_a_step_that_fails_leaves_the_file_at_the_version_before(old: Path) -> None:
    connection = _open(old)
    with pytest.raises(sqlite3.OperationalError, match="planted"):
        migrated(connection, old, {0: _with_view, 1: _fails}, to_version=2)
    assert connection.execute("PRAGMA user_version").fetchone() == (1,)  # the first step stood
    assert connection.execute("SELECT count(*) FROM record WHERE kind = 'reading'").fetchone() == (2,)
    connection.close()


def test_a_second_copy_never_overwrites_the_first(old: Path) -> None:
    old.with_name("old.version-0.wattproof").write_bytes(b"mine")
    connection = _open(old)
    assert migrated(connection, old, {0: _with_view}) == old.with_name("old.version-0-2.wattproof")
    connection.close()
    assert old.with_name("old.version-0.wattproof").read_bytes() == b"mine"


def test_appending_brings_an_old_file_up_and_reading_changes_none(old: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    steps = MappingProxyType({0: _with_view})
    for name in ("migrated", "step_up", "require_way"):
        function = getattr(__import__("wattproof.store.migrations", fromlist=[name]), name)
        defaults = tuple(steps if default is STEPS else default for default in function.__defaults__)
        monkeypatch.setattr(function, "__defaults__", defaults)
    before = old.read_bytes()
    with SessionReader(old) as reader:
        assert len(reader.runs[0].readings) == 2
    assert old.read_bytes() == before
    with SessionFile(old) as session:
        session.note("gone on with")
    assert _open(old).execute("PRAGMA user_version").fetchone() == (VERSION,)
    assert old.with_name("old.version-0.wattproof").exists()
    assert recheck(old, workers=1).sound


def test_a_version_without_a_way_is_refused_in_one_sentence(old: Path) -> None:
    for opener in (SessionFile, SessionReader):
        with pytest.raises(WrongUseError, match="of version 0, from which no way leads to 1; update wattproof"):
            opener(old)


def test_every_earlier_version_has_a_step() -> None:
    assert set(STEPS) == set(range(1, VERSION))  # version 1 is the first that was ever written
