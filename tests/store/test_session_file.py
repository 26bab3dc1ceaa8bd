"""A session file keeps what it is given, says in one sentence what stands in its way, and never harms what it holds."""

import os
import shutil
import sqlite3
import subprocess
import sys
import tempfile
import threading
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from tests.store.made import BLOCK, LEAD, begun, calibration, made_readings, made_session
from wattproof.core.device import DeviceUnderTest
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Kind as NoteKind
from wattproof.core.notes import note
from wattproof.core.run import Ending
from wattproof.procedures.requests import Said
from wattproof.store.recheck import recheck
from wattproof.store.schema import APPLICATION_ID, VERSION
from wattproof.store.session_file import SessionFile
from wattproof.store.session_reader import SessionReader
from wattproof.store.session_values import Keeping, Kind, Stretch
from wattproof.store.trouble import DamagedError


def test_what_was_kept_is_read_back_as_it_was(tmp_path: Path) -> None:
    known = calibration()
    made = list(made_readings(3, known))
    with SessionFile(tmp_path / "one") as session:
        session.describe(DeviceUnderTest(name="Kestrel 30", serial="0042", claim="2 x 50 W"))
        session.add_photo(b"\x89PNG...", "front.png")
        log = begun(session, known)
        for each in made:
            log.keep(*each)
        log.find(Said(note(NoteKind.TYPED_SCALE)))
        session.note("warm after ten minutes", log)
        log.end(Ending.STOPPED, "by a person")
    with SessionReader(tmp_path / "one.wattproof") as reader:
        (run,) = reader.runs
        assert reader.device == DeviceUnderTest(name="Kestrel 30", serial="0042", claim="2 x 50 W")
        assert [photo.content for photo in reader.photos] == [b"\x89PNG..."]
        assert reader.notes == ("warm after ten minutes",)
        assert [stored.kept.reading for stored in run.readings] == [kept.reading for kept, _, _ in made]
        assert [stored.kept.mark for stored in run.readings] == [kept.mark for kept, _, _ in made]
        assert run.findings == (Said(note(NoteKind.TYPED_SCALE)),)
        assert run.ending is not None
        assert (run.ending.ending, run.ending.why, run.ending.readings) == (Ending.STOPPED, "by a person", 3)
        assert run.facts.bench.seeds == {"made": 7}
        assert {"numpy", "wattproof", "sqlite", "libsndfile"} <= run.facts.versions.keys()
        for stored, (_, raw, _) in zip(run.readings, made, strict=True):
            np.testing.assert_array_equal(run.samples.capture(stored, stored.raw).samples, raw.samples)


def test_a_closed_session_is_one_file_with_its_mark_strict_tables_and_no_free_page(tmp_path: Path) -> None:
    made_session(tmp_path / "one.wattproof", 2)
    assert [path.name for path in tmp_path.iterdir()] == ["one.wattproof"]
    connection = sqlite3.connect(tmp_path / "one.wattproof")
    ask = {
        name: connection.execute(f"PRAGMA {name}").fetchone()[0]
        for name in ("application_id", "user_version", "freelist_count", "journal_mode")
    }
    strict = dict(
        connection.execute(
            "SELECT name, strict FROM pragma_table_list WHERE type = 'table' AND name NOT LIKE 'sqlite%'"
        )
    )
    connection.close()
    assert ask == {
        "application_id": APPLICATION_ID,
        "user_version": VERSION,
        "freelist_count": 0,
        "journal_mode": "delete",
    }
    assert strict == {"record": 1, "content": 1}


def test_blocks_that_overlap_store_each_frame_once(tmp_path: Path) -> None:
    known = calibration()
    kept, raw, block = next(made_readings(1, known))
    with SessionFile(tmp_path / "one.wattproof") as session:
        log = begun(session, known)
        for _ in range(5):
            log.keep(kept, raw, block)
        log.end(Ending.DONE)
    with SessionReader(tmp_path / "one.wattproof") as reader:
        (run,) = reader.runs
        assert len(run.readings) == 5
        assert [row.content["frames"] for row in reader.of_run(run.seq, Kind.CAPTURE)] == [LEAD + BLOCK]


def test_a_session_is_gone_on_with_and_a_calibration_that_stays_is_stored_once(tmp_path: Path) -> None:
    path = tmp_path / "one.wattproof"
    for volts in (2.0, 2.0, 1.9):
        made_session(path, 1, volts)
    with SessionReader(path) as reader:
        assert [run.number for run in reader.runs] == [1, 2, 3]
        assert reader.ask("SELECT count(*) FROM record WHERE kind = 'calibration'") == [(2,)]
    assert recheck(path, workers=1).reproduced == 3


def test_only_captures_that_the_statement_rests_on_stay_where_that_was_chosen(tmp_path: Path) -> None:
    known, path = calibration(), tmp_path / "one.wattproof"
    with SessionFile(path) as session:
        log = begun(session, known, Keeping.POINTS)
        for each in made_readings(30, known):
            log.keep(*each)
        log.end(Ending.DONE)
    outcome = recheck(path, workers=1)
    assert outcome.sound, outcome
    with SessionReader(path) as reader:
        run = reader.runs[0]
        there = [not run.samples.let_go(stored.block) for stored in run.readings]
        crossed = [
            index
            for index, stored in enumerate(run.readings)
            if (thdn := stored.kept.reading.thdn) and thdn.value >= 0.01
        ]
        assert reader.ask("PRAGMA freelist_count") == [(0,)]
    assert outcome.let_go == there.count(False) > 10
    assert there[crossed[0] - 2 : crossed[0] + 2] == [True] * 4  # both sides of 1 %, and one more beyond each


def test_a_run_that_nobody_ended_says_so(tmp_path: Path) -> None:
    with SessionFile(tmp_path / "one.wattproof") as session:
        begun(session, calibration())
    with SessionReader(tmp_path / "one.wattproof") as reader:
        assert reader.runs[0].ending is not None
        assert reader.runs[0].ending.ending is Ending.FAILED


def test_a_second_program_is_refused_in_one_sentence_and_harms_nothing(tmp_path: Path) -> None:
    path = tmp_path / "one.wattproof"
    made_session(path, 1)
    with SessionFile(path):
        for opener in (SessionFile, SessionReader):
            with pytest.raises(WrongUseError, match=r"one.wattproof: another program has it open; close it there"):
                opener(path)
    assert recheck(path, workers=1).sound


def test_a_disk_that_is_full_ends_the_keeping_and_not_the_measurement(tmp_path: Path) -> None:
    known, path = calibration(), tmp_path / "one.wattproof"
    session = SessionFile(path)
    log = begun(session, known)
    made = list(made_readings(6, known))
    log.keep(*made[0])
    session.note("kept so far")
    writer = session._writer  # noqa: SLF001 - a small disk is made through it
    writer.ask(f"PRAGMA max_page_count = {writer.ask('PRAGMA page_count')[0][0] + 16}")
    for each in made[1:]:
        log.keep(*each)
    log.end(Ending.DONE)
    assert session.trouble == f"{path}: the disk is full: what was kept before stands; make room, then measure again"
    session.close()
    outcome = recheck(path, workers=1)
    assert outcome.sound
    assert outcome.reproduced >= 1


def test_a_file_that_may_grow_no_further_is_told_in_one_sentence(tmp_path: Path) -> None:
    script = (
        "import resource, signal, sys\nfrom pathlib import Path\nsys.path.insert(0, '.')\n"
        "from tests.store.made import begun, calibration, made_readings\n"
        "from wattproof.store.session_file import SessionFile\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "known = calibration(); session = SessionFile(Path(sys.argv[1])); log = begun(session, known)\n"
        "made = list(made_readings(9, known)); log.keep(*made[0]); session.note('so far')\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (150_000, 150_000))\n"
        "[log.keep(*each) for each in made[1:]]; log._writer.stop(); print(session.trouble)\n"
    )
    path = tmp_path / "one.wattproof"
    done = subprocess.run([sys.executable, "-c", script, path], capture_output=True, text=True, check=True, env=_env())
    assert done.stdout.startswith(f"{path}: ")
    assert done.stdout.count("\n") == 1
    assert "what was kept before stands" in done.stdout
    assert recheck(path, workers=1).sound


def _env() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": os.pathsep.join(p for p in sys.path if p), "OPENBLAS_NUM_THREADS": "1"}


@pytest.fixture
def open_folder() -> Iterator[Path]:
    """A folder that other users may reach, which pytest's own is not."""
    folder = Path(tempfile.mkdtemp())
    folder.chmod(0o755)
    yield folder
    for path in (folder, *(path for path in folder.rglob("*") if path.is_dir())):
        path.chmod(0o755)
    shutil.rmtree(folder)


_AS_NOBODY = (  # file modes bind anybody but root
    "import os, sys\nfrom pathlib import Path\nfrom wattproof.store.session_file import SessionFile\n"
    "if os.geteuid() == 0: os.setuid(65534)\nSessionFile(Path(sys.argv[1]))"
)


@pytest.mark.parametrize("is_new", [True, False])
def test_a_read_only_place_is_told_in_one_sentence(open_folder: Path, *, is_new: bool) -> None:
    path = open_folder / "folder" / "one.wattproof"
    path.parent.mkdir()
    if not is_new:
        made_session(path, 1)
        path.chmod(0o444)
    path.parent.chmod(0o555)
    done = subprocess.run(
        [sys.executable, "-c", _AS_NOBODY, path], capture_output=True, text=True, check=False, env=_env()
    )
    said = done.stderr.strip().splitlines()[-1]
    assert f"WrongUseError: {path}: " in said
    assert ("cannot be opened or written there" if is_new else "it is read-only") in said
    if not is_new:
        assert recheck(path, workers=1).sound


def test_a_disk_without_locks_is_told_in_one_sentence(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuses(*_: object, **__: object) -> sqlite3.Connection:
        raise sqlite3.OperationalError("locking protocol")

    monkeypatch.setattr("wattproof.store.connection.sqlite3.connect", refuses)
    with pytest.raises(WrongUseError, match=r"share fails or does not lock files.*copy the session to a local disk"):
        SessionFile(tmp_path / "one.wattproof")


def test_a_file_from_a_newer_program_is_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "one.wattproof"
    made_session(path, 1)
    connection = sqlite3.connect(path)
    connection.execute(f"PRAGMA user_version = {VERSION + 1}")
    connection.close()
    before = path.read_bytes()
    for opener in (SessionFile, SessionReader):
        with pytest.raises(
            WrongUseError, match=f"newer program .version {VERSION + 1}, this one knows {VERSION}.; update"
        ):
            opener(path)
    assert path.read_bytes() == before


@pytest.mark.parametrize("content", [b"", b"RIFF....WAVE", b"SQLite format 3\0" + bytes(200)])
def test_what_is_no_session_is_refused(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "one.wattproof"
    path.write_bytes(content)
    with pytest.raises(DamagedError, match=r"one.wattproof: it is"):
        SessionReader(path)


def test_a_damaged_page_is_told_and_nothing_is_changed(tmp_path: Path) -> None:
    path = tmp_path / "one.wattproof"
    made_session(path, 4)
    content = bytearray(path.read_bytes())
    content[4096:8192] = bytes([0xA5]) * 4096
    path.write_bytes(content)
    with pytest.raises(WrongUseError, match=r"the file is damaged .*; nothing was changed in it"):
        SessionFile(path)
    assert path.read_bytes() == content
    assert not recheck(path, workers=1).sound


def test_many_threads_may_write_at_once(tmp_path: Path) -> None:
    path = tmp_path / "one.wattproof"
    with SessionFile(path) as session:
        threads = [threading.Thread(target=_say_ten_times, args=(session,)) for _ in range(4)]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()
    assert recheck(path, workers=1).sound
    with SessionReader(path) as reader:
        assert len(reader.notes) == 40


def _say_ten_times(session: SessionFile) -> None:
    for _ in range(10):
        session.note("said")


def test_a_stretch_is_missing_where_nothing_covers_it(tmp_path: Path) -> None:
    made_session(tmp_path / "one.wattproof", 2)
    with SessionReader(tmp_path / "one.wattproof") as reader:
        run = reader.runs[0]
        with pytest.raises(ValueError, match="raw capture of frames 12000 to 12001 is missing"):
            run.samples.capture(run.readings[0], Stretch(0, LEAD + BLOCK + 1))
