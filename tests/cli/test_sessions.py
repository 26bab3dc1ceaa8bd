"""Measure, recheck, compare, export and report from the command line, as one who has only that would."""

import json
import os
import shutil
import sqlite3
import subprocess
import sys
import time
from pathlib import Path

import pandas as pd
import pytest
import soundfile

from tests.house.sources import ROOT
from tests.store.made import made_session
from wattproof.__main__ import main
from wattproof.report.table_columns import POINT_DICTIONARY, READING_DICTIONARY
from wattproof.runner.session_table import sittings_of
from wattproof.store.session_reader import SessionReader
from wattproof.store.session_values import Kind


@pytest.fixture(scope="module")
def measured(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("measured") / "kestrel.wattproof"
    arguments = [
        "--hold-s",
        "0.2",
        "--step-db",
        "3",
        "--read-s",
        "0.2",
        "--rise-db-per-s",
        "60",
        "--device",
        "Kestrel 30",
        "--serial",
        "0042",
    ]
    assert main(["measure", "power", "--session", str(path), "--json", *arguments]) == 0
    return path


def _said(capsys: pytest.CaptureFixture[str], *arguments: str | Path) -> tuple[int, str, str]:
    capsys.readouterr()
    status = main([str(each) for each in arguments])
    said = capsys.readouterr()
    return status, said.out, said.err


def test_recheck_says_consistent_and_untouched_only_against_a_hash(
    measured: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    status, out, _ = _said(capsys, "recheck", measured)
    assert status == 0
    assert "readings reproduced, largest difference" in out
    assert "consistent (give --expect HASH" in out
    assert "untouched" not in out
    head = out.split()[-1]
    status, out, _ = _said(capsys, "recheck", measured, "--expect", head.upper())
    assert (status, "untouched since the hash was given" in out) == (0, True)


def test_a_touched_session_is_told_with_status_1(
    measured: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    copy = Path(shutil.copy(measured, tmp_path))
    connection = sqlite3.connect(copy, isolation_level=None)
    connection.execute("DELETE FROM content WHERE seq = (SELECT min(seq) FROM content)")
    connection.close()
    status, out, _ = _said(capsys, "recheck", copy, measured, "--json")
    document = json.loads(out)
    assert (status, [each["sound"] for each in document["sessions"]]) == (1, [False, True])
    assert document["sessions"][0]["differences"]
    status, out, _ = _said(capsys, "recheck", copy)
    assert (status, "not as it was written or measured" in out, "differs: run 1, reading" in out) == (1, True, True)


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("recheck", "nowhere.wattproof"), "nowhere.wattproof: there is no such file"),
        (("recheck", "a", "--expect", "abc"), "--expect abc: it is no hash; give 64 hexadecimal digits"),
        (("recheck", "a", "b", "--expect", "0" * 64), "--expect belongs to one session"),
        (("report", "a.wattproof", "--to", "a.doc"), "give a name that ends in .html or .pdf"),
        (("export", "a.wattproof"), "--to is missing"),
        (("export",), "give either sessions with --to FOLDER, or --table FOLDER"),
        (("export", "--table", "."), "there is no session"),
        (("measure", "power", "--serial", "1"), "what is tested is kept in a session; add --session FILE"),
    ],
)
def test_wrong_use_is_one_line(
    arguments: tuple[str, ...],
    said: str,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(tmp_path)
    status, _, err = _said(capsys, *arguments)
    assert (status, said in err, err.count("\n")) == (2, True, 1)


def test_a_second_run_is_appended_and_compared_with_the_first(
    measured: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    other = tmp_path / "other.wattproof"
    made_session(other, 30)
    made_session(other, 30, volts=1.9)
    status, out, _ = _said(capsys, "compare", other, "--json")
    (comparison,) = json.loads(out)["comparisons"]
    assert status == 0
    for point in comparison["points"]:
        # two calibrations that share nothing: 1.9 V instead of 2 V is a power of 0.9025, known to 2·√2·0.004 in all
        assert point["power_ratio"]["value"] == pytest.approx(0.9025, rel=1e-6, abs=0.0)
        assert point["power_ratio"]["u"] == pytest.approx(0.9025 * 2.0 * 2.0**0.5 * 0.002 * 2.0, rel=0.02, abs=0.0)
        assert point["differs"]
    status, out, _ = _said(capsys, "compare", measured, other, "--plot", tmp_path / "both.svg")
    assert (status, "against Kestrel 30, kestrel.wattproof" in out) == (0, True)
    assert (tmp_path / "both.svg").read_text(encoding="utf-8").count("<polyline") == 2


def test_what_both_share_cancels_in_a_comparison(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "twice.wattproof"
    made_session(path, 30)
    made_session(path, 30)
    _, out, _ = _said(capsys, "compare", path, "--json")
    (comparison,) = json.loads(out)["comparisons"]
    assert comparison["points"]
    for point in comparison["points"]:
        assert not point["differs"]
        assert point["power_ratio"]["u"] < 0.1 * point["first_w"]["u"] / point["first_w"]["value"]


def test_an_export_is_read_back_by_other_programs(
    measured: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    status, out, _ = _said(capsys, "export", measured, "--to", tmp_path, "--parquet")
    folder = tmp_path / "kestrel"
    assert (status, f"files in {folder}" in out) == (0, True)
    with SessionReader(measured) as reader:
        readings = [stored.kept.reading for stored in reader.runs[0].readings]
        captures = [
            (row.content["first_frame"], row.content["frames"])
            for row in reader.of_run(reader.runs[0].seq, Kind.CAPTURE)
        ]
    tables = (
        pd.read_csv(folder / "readings.csv"),
        pd.read_parquet(folder / "readings.parquet"),
        pd.read_json(folder / "readings.json"),
    )
    for table in tables:
        assert list(table.columns) == list(READING_DICTIONARY)
        assert table["power_w"].tolist() == pytest.approx(
            [r.power_w.value for r in readings if r.power_w], rel=1e-9, abs=0.0
        )
        assert table["u_thdn_ratio"].tolist() == pytest.approx(
            [r.thdn.u for r in readings if r.thdn], rel=1e-9, abs=0.0
        )
    assert json.loads((folder / "readings.dictionary.json").read_text())["power_w"]["unit"] == "W"
    points = pd.read_csv(folder / "points.csv")
    assert points["point"].tolist() == ["onset", "1 %", "10 %"]
    for first, frames in captures:
        assert soundfile.info(folder / "captures" / f"run-1-frame-{first}.flac").frames == frames
    assert (folder / "run-1-thdn.png").read_bytes().startswith(b"\x89PNG")
    assert (folder / "run-1-thdn.svg").read_text(encoding="utf-8").startswith("<svg")


def test_a_folder_of_sessions_is_one_table(measured: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for name in ("a", "b/c"):
        (tmp_path / name).parent.mkdir(exist_ok=True)
        shutil.copy(measured, tmp_path / f"{name}.wattproof")
    (tmp_path / "broken.wattproof").write_bytes(b"no session")
    status, out, err = _said(capsys, "export", "--table", tmp_path)
    (tmp_path / "table.csv").write_text(out, encoding="utf-8")
    table = pd.read_csv(tmp_path / "table.csv")
    assert (status, "broken.wattproof" in err) == (1, True)
    assert list(table.columns) == list(POINT_DICTIONARY)
    assert table["session"].tolist() == ["a.wattproof"] * 3 + ["c.wattproof"] * 3
    (sitting,) = sittings_of(measured)
    stated = [point.power_w.value for row in sitting.statement.rows for point in row.points if point.power_w]
    assert table["power_w"].tolist() == pytest.approx(stated * 2, rel=1e-12, abs=0.0)


def test_a_report_is_written_in_both_kinds(measured: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for name in ("report.html", "report.pdf"):
        status, out, _ = _said(capsys, "report", measured, "--to", tmp_path / name, "--paper", "letter")
        assert (status, out) == (0, f"written: {tmp_path / name}\n")
    assert (tmp_path / "report.html").read_text(encoding="utf-8").startswith("<!doctype html>")
    assert (tmp_path / "report.pdf").read_bytes().startswith(b"%PDF")


def test_a_measurement_that_is_killed_leaves_a_session_that_opens(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "killed.wattproof"
    env = {**os.environ, "PYTHONPATH": str(ROOT / "src")}
    command = [sys.executable, "-m", "wattproof", "measure", "power", "--session", str(path)]
    with subprocess.Popen(command, env=env, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL) as program:
        log = path.with_name(path.name + "-wal")
        while program.poll() is None and not (log.exists() and log.stat().st_size > 1_000_000):
            time.sleep(0.02)  # nothing is timed: the file grows
        program.kill()
    status, out, _ = _said(capsys, "recheck", path)
    assert status == 0
    assert "readings reproduced" in out
    with SessionReader(path) as reader:
        assert reader.runs[0].reading_count >= 1
        assert reader.runs[0].ending is None
