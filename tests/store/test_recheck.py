"""A session that was touched is found out; one that was not is reproduced to a small part of its uncertainty."""

import json
import random
import re
import shutil
import sqlite3
from pathlib import Path

import attrs
import pytest

from tests.store.made import begun, calibration, made_readings, made_session
from wattproof.core.quantity import Quantity
from wattproof.core.run import Ending
from wattproof.store.chain import START, link
from wattproof.store.recheck import OF_UNCERTAINTY, compared, recheck, written_wrong
from wattproof.store.session_file import SessionFile
from wattproof.store.session_reader import SessionReader
from wattproof.store.session_values import StoredReading
from wattproof.store.values import canonical, structured, unstructured

TAMPERINGS = 1000
FLIPS, FOUND_OF_FLIPS = 100, 98  # issue: at least 98 of 100 random one-byte changes anywhere in the closed file


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("made") / "one.wattproof"
    for volts in (2.0, 1.9):
        made_session(path, 6, volts)
    return path


@pytest.fixture
def copy(made: Path, tmp_path: Path) -> Path:
    return Path(shutil.copy(made, tmp_path))


def test_every_reading_is_reproduced(made: Path) -> None:
    outcome = recheck(made, workers=1)
    assert outcome.sound
    assert (outcome.readings, outcome.reproduced, outcome.let_go, outcome.unread) == (12, 12, 0, 0)
    assert outcome.largest < OF_UNCERTAINTY


def test_several_processes_find_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("wattproof.store.recheck.WORTH_A_PROCESS", 3)
    made_session(tmp_path / "one.wattproof", 8)
    assert recheck(tmp_path / "one.wattproof", workers=2) == recheck(tmp_path / "one.wattproof", workers=1)


def test_the_right_hash_is_accepted_and_a_cut_tail_shows_only_against_it(copy: Path) -> None:
    head = recheck(copy, workers=1).head
    assert recheck(copy, head, workers=1).sound
    _edit(copy, "DELETE FROM record WHERE seq = (SELECT max(seq) FROM record)")
    assert recheck(copy, workers=1).sound  # consistent in itself: nothing in the file tells
    assert not recheck(copy, head, workers=1).sound


def test_a_chain_that_was_rewritten_as_a_whole_shows_only_against_the_hash(copy: Path) -> None:
    head = recheck(copy, workers=1).head
    connection = sqlite3.connect(copy)
    connection.execute("UPDATE record SET at = '2020-01-01T00:00:00.000+00:00' WHERE kind = 'session'")
    _relinked(connection)
    assert recheck(copy, workers=1).sound
    assert "not in the hash that is expected" in recheck(copy, head, workers=1).faults[0]


def test_an_edited_reading_is_found_even_where_its_chain_was_rewritten(copy: Path) -> None:
    connection = sqlite3.connect(copy)
    seq, body = connection.execute("SELECT seq, body FROM record WHERE kind = 'reading' LIMIT 1").fetchone()
    content = json.loads(body)
    content["kept"]["reading"]["power_w"]["value"] *= 1.02
    connection.execute("UPDATE record SET body = ? WHERE seq = ?", (canonical(content), seq))
    _relinked(connection)
    outcome = recheck(copy, workers=1)
    assert outcome.faults == ()
    assert [(each.run, each.number) for each in outcome.differences] == [(1, 1)]
    assert "power_w was" in outcome.differences[0].why


def test_a_swapped_calibration_is_found_even_where_the_chain_was_rewritten(copy: Path) -> None:
    connection = sqlite3.connect(copy)
    (one, first), (other, second) = connection.execute(
        "SELECT seq, body FROM record WHERE kind = 'calibration'"
    ).fetchall()
    connection.execute("UPDATE record SET body = ? WHERE seq = ?", (second, one))
    connection.execute("UPDATE record SET body = ? WHERE seq = ?", (first, other))
    _relinked(connection)
    outcome = recheck(copy, workers=1)
    assert outcome.reproduced == 0
    assert len(outcome.differences) == 12


@pytest.mark.parametrize(
    ("sql", "said"),
    [
        ("DELETE FROM content WHERE seq = (SELECT min(seq) FROM content)", "the capture of record"),
        (
            "DELETE FROM record WHERE kind = 'reading' AND number = 2 AND run = (SELECT min(run) FROM record)",
            "is missing",
        ),
        ("UPDATE record SET at = '2020' WHERE seq = 2", r"record 2 \(calibration\) is not as it was written"),
        ("INSERT INTO content VALUES (1, x'00')", "record 1 has bytes that no record names"),
        ("CREATE TABLE more (x)", "the tables are not those of a session"),
        ("DELETE FROM record WHERE seq = 1", "record 1 is missing"),
        ("UPDATE record SET body = '{' WHERE kind = 'run'", "a run cannot be read|is not as it was written"),
    ],
)
def test_what_was_done_to_it_is_said(copy: Path, sql: str, said: str) -> None:
    _edit(copy, sql)
    outcome = recheck(copy, workers=1)
    assert not outcome.sound
    told = [*outcome.faults, *(each.why for each in outcome.differences)]
    assert any(re.search(said, each) for each in told), told


def test_each_of_many_random_tamperings_is_found(made: Path) -> None:
    """With a record, a capture or a calibration, in copies in memory; the file itself is not rewritten."""
    content, dice = made.read_bytes(), random.Random(2)  # noqa: S311 - the tests choose, nobody hides
    unseen = []
    for number in range(TAMPERINGS):
        connection = sqlite3.connect(":memory:", isolation_level=None)
        connection.deserialize(content)
        ways = (_capture_touched, _record_touched, _records_swapped, _record_removed, _calibration_touched)
        ways[number % len(ways)](connection, dice)
        if not list(written_wrong(_in_memory(connection))):
            unseen.append(number)
        connection.close()
    assert unseen == []


def test_nearly_every_random_change_of_one_byte_is_found(tmp_path: Path) -> None:
    path, dice = tmp_path / "one.wattproof", random.Random(3)  # noqa: S311 - likewise
    made_session(path, 40)
    content = path.read_bytes()
    found = 0
    for _ in range(FLIPS):
        at = dice.randrange(len(content))
        path.write_bytes(content[:at] + bytes([content[at] ^ dice.randrange(1, 256)]) + content[at + 1 :])
        found += _looks_wrong(path)
    path.write_bytes(content)
    assert not _looks_wrong(path)
    assert found >= FOUND_OF_FLIPS


def test_a_figure_beyond_the_tolerance_differs_and_one_within_does_not() -> None:
    kept, _, _ = next(made_readings(1, calibration()))
    was, power = kept.reading, kept.reading.power_w
    assert power is not None
    for share, differs in ((0.5, False), (1.5, True)):
        moved = attrs.evolve(power, value=power.value + share * OF_UNCERTAINTY * power.u)
        largest, why = compared(was, attrs.evolve(was, power_w=moved))
        assert bool(why) == differs
        assert largest == pytest.approx(
            share * OF_UNCERTAINTY, rel=1e-6, abs=0.0
        )  # the definition; rel for the rounding
    assert "uncertainty" in compared(was, attrs.evolve(was, power_w=Quantity(power.value, "W")))[1]
    assert compared(was, attrs.evolve(was, power_w=None))[1] == "power_w is stated in one of both only"


def test_a_reading_comes_back_from_its_text_bit_for_bit() -> None:
    kept, raw, block = next(made_readings(1, calibration()))
    stored = StoredReading(kept, block, block, raw.gaps)
    assert structured(json.loads(canonical(unstructured(stored))), StoredReading).kept.reading == kept.reading


def test_a_run_that_was_killed_is_rechecked_as_far_as_it_came(tmp_path: Path) -> None:
    path = tmp_path / "one.wattproof"
    known = calibration()
    session = SessionFile(path)
    log = begun(session, known)
    for each in made_readings(3, known):
        log.keep(*each)
    log.end(Ending.DONE)
    copies = [
        Path(shutil.copy(each, tmp_path / f"copy{each.name[3:]}"))
        for each in (path, path.with_name(path.name + "-wal"))
    ]
    session.close()
    assert recheck(copies[0], workers=1).reproduced == 3


def _edit(path: Path, sql: str) -> None:
    connection = sqlite3.connect(path, isolation_level=None)
    connection.execute(sql)
    connection.close()


def _relinked(connection: sqlite3.Connection) -> None:
    """Write the whole chain anew, as somebody would who knows how it is made."""
    previous = START
    for seq, *fields in connection.execute(
        "SELECT seq, kind, run, number, at, body FROM record ORDER BY seq"
    ).fetchall():
        previous = link(previous, seq, *fields)
        connection.execute("UPDATE record SET hash = ? WHERE seq = ?", (previous, seq))
    connection.commit()
    connection.close()


def _in_memory(connection: sqlite3.Connection) -> SessionReader:
    reader = SessionReader.__new__(SessionReader)
    reader.path, reader._connection = Path("memory"), connection  # noqa: SLF001 - what opening a file would set
    return reader


def _looks_wrong(path: Path) -> bool:
    try:
        with SessionReader(path) as reader:
            return bool(list(written_wrong(reader)))
    except Exception:  # noqa: BLE001 - refusing to open it is finding it
        return True


def _one(connection: sqlite3.Connection, dice: random.Random, table: str, where: str = "1") -> int:
    rows = connection.execute(f"SELECT seq FROM {table} WHERE {where}").fetchall()  # noqa: S608 - the tests' own words
    return int(dice.choice(rows)[0])


def _flipped(content: bytes, dice: random.Random) -> bytes:
    at = dice.randrange(len(content))
    return content[:at] + bytes([content[at] ^ (1 << dice.randrange(8))]) + content[at + 1 :]


def _capture_touched(connection: sqlite3.Connection, dice: random.Random) -> None:
    seq = _one(connection, dice, "content")
    (content,) = connection.execute("SELECT bytes FROM content WHERE seq = ?", (seq,)).fetchone()
    connection.execute("UPDATE content SET bytes = ? WHERE seq = ?", (_flipped(content, dice), seq))


def _record_touched(connection: sqlite3.Connection, dice: random.Random, where: str = "1") -> None:
    seq = _one(connection, dice, "record", where)
    column = dice.choice(["body", "at", "kind", "number", "hash"])
    (old,) = connection.execute(f"SELECT {column} FROM record WHERE seq = ?", (seq,)).fetchone()  # noqa: S608 - likewise
    at = dice.randrange(len(str(old)))
    digit = "7" if str(old)[at] != "7" else "3"
    new = f"{str(old)[:at]}{digit}{str(old)[at + 1 :]}"
    connection.execute(f"UPDATE record SET {column} = ? WHERE seq = ?", (new, seq))  # noqa: S608 - likewise


def _records_swapped(connection: sqlite3.Connection, dice: random.Random) -> None:
    one, other = dice.sample(range(1, connection.execute("SELECT max(seq) FROM record").fetchone()[0] + 1), 2)
    names = "kind, run, number, at, body, hash"
    rows = [connection.execute(f"SELECT {names} FROM record WHERE seq = ?", (seq,)).fetchone() for seq in (one, other)]  # noqa: S608 - likewise
    for seq, row in zip((other, one), rows, strict=True):
        connection.execute("UPDATE record SET kind=?, run=?, number=?, at=?, body=?, hash=? WHERE seq = ?", (*row, seq))


def _record_removed(connection: sqlite3.Connection, dice: random.Random) -> None:
    last = connection.execute("SELECT max(seq) FROM record").fetchone()[0]
    connection.execute("DELETE FROM record WHERE seq = ?", (_one(connection, dice, "record", f"seq < {last}"),))


def _calibration_touched(connection: sqlite3.Connection, dice: random.Random) -> None:
    _record_touched(connection, dice, "kind = 'calibration'")
