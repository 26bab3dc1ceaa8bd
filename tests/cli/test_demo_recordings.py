"""What demo_recordings/README.md says that reading its recordings must say, is what reading them says."""

import json
import math
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

FOLDER = Path(__file__).parents[2] / "demo_recordings"
FILES = sorted(FOLDER.glob("*.flac"))
CONSTANT_TOLERANCE = 0.0  # figures carry their own tolerance in the table; nothing is added to it
COLUMNS = {  # column of the table: key of the reading and the factor from its value
    "tone, Hz": ("fundamental_hz", 1.0),
    "level, dBFS": ("level_dbfs", 1.0),
    "THD+N, %": ("thdn", 100.0),
    "THD, %": ("thd", 100.0),
    "noise, %": ("noise", 100.0),
    "hum, %": ("hum", 100.0),
}


def table_rows() -> Iterator[dict[str, str]]:
    """Yield the rows of the README's table of figures, cells by the head of their column."""
    lines = (FOLDER / "README.md").read_text(encoding="utf-8").splitlines()
    rows = [[cell.strip() for cell in line.strip("|").split("|")] for line in lines if line.startswith("| ")]
    first = next(number for number, row in enumerate(rows) if "channel" in row)
    for row in rows[first + 2 :]:
        yield dict(zip(rows[first], row, strict=True))


ROWS = list(table_rows())


def wattproof(*arguments: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "wattproof", *arguments],
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
        timeout=120,
    )


@pytest.fixture(scope="module")
def printed() -> str:
    """What one call that reads all demo recordings prints."""
    done = wattproof("read", *map(str, FILES), "--json")
    assert done.stderr == ""
    assert done.returncode == 1  # some readings are not ok, and that is what they were made for
    return done.stdout


@pytest.fixture(scope="module")
def document(printed: str) -> dict[str, Any]:
    """The same, parsed."""
    return dict(json.loads(printed))


@pytest.fixture(scope="module")
def readings(document: dict[str, Any]) -> dict[tuple[str, str], dict[str, Any]]:
    """Every reading by file name and channel."""
    return {
        (Path(file["source"]["file"]).name, str(reading["channel"])): reading
        for file in document["files"]
        for reading in file["readings"]
    }


def test_the_files_come_in_the_order_given(document: dict[str, Any]) -> None:
    assert document["wattproof"] == "readings"
    assert [file["source"]["file"] for file in document["files"]] == [str(path) for path in FILES]


def test_the_table_names_every_recording_and_channel(readings: dict[tuple[str, str], dict[str, Any]]) -> None:
    assert [(row["file"], row["channel"]) for row in ROWS] == list(readings)


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['file']}, channel {row['channel']}")
def test_a_reading_says_what_the_table_says(
    readings: dict[tuple[str, str], dict[str, Any]], row: dict[str, str]
) -> None:
    reading = readings[row["file"], row["channel"]]
    assert reading["state"] == row["state"]
    for column, (key, factor) in COLUMNS.items():
        assert_figure(row[column], reading[key], factor, reading)
    if row["mains, Hz"] == "-":
        assert reading["mains"]["frequency_hz"] is None
    else:
        value, tolerance = map(float, row["mains, Hz"].split("±"))
        assert reading["mains"]["frequency_hz"] == pytest.approx(value, rel=0, abs=tolerance)
    words = [] if row["notes"] == "none" else row["notes"].split("; ")
    assert len(reading["notes"]) == len(words)
    assert all(word in note for word, note in zip(words, reading["notes"], strict=True)), reading["notes"]


def assert_figure(cell: str, quantity: dict[str, Any] | None, factor: float, reading: dict[str, Any]) -> None:
    """Check one cell: "value ± tolerance", "-" for null, or "below noise"."""
    if cell == "-":
        assert quantity is None
        return
    assert quantity is not None
    if cell == "below noise":
        assert quantity["value"] < reading["noise"]["value"]
        return
    value, tolerance = map(float, cell.split("±"))
    assert factor * quantity["value"] == pytest.approx(value, rel=CONSTANT_TOLERANCE, abs=tolerance)


def test_parts_of_a_reading_add_up(readings: dict[tuple[str, str], dict[str, Any]]) -> None:
    """THD+N² = THD² + hum² + noise², which the contract states."""
    sound = [reading for reading in readings.values() if reading["state"] == "ok"]
    assert len(sound) == 8
    for reading in sound:
        parts = math.hypot(*(reading[key]["value"] for key in ("thd", "hum", "noise")))
        assert reading["thdn"]["value"] == pytest.approx(parts, rel=1e-9, abs=0)


def test_the_cafe_s_scale_gives_volts_and_watts() -> None:
    """-10 dBFS of 40 V rms is 12.649 V, into 8 Ω 20.00 W (closed form; tolerance: 0.01 dB of level)."""
    arguments = ["--full-scale-vrms", "40", "--load", "8", "--channel", "1"]
    done = wattproof("read", str(FILES[0]), *arguments, "--json")
    assert done.returncode == 0
    (reading,) = json.loads(done.stdout)["readings"]
    assert reading["level_vrms"]["value"] == pytest.approx(12.649, rel=0, abs=0.015)
    assert reading["power_w"]["value"] == pytest.approx(20.00, rel=0, abs=0.05)
    table = wattproof("read", str(FILES[0]), *arguments)
    assert table.returncode == 0
    assert "12.6" in table.stdout
    assert "the load is 8 Ω" in table.stdout


def test_a_program_can_take_the_json_from_a_pipe(printed: str) -> None:
    taken = subprocess.run(
        [sys.executable, "-m", "json.tool"], input=printed, capture_output=True, text=True, check=True, timeout=60
    )
    assert taken.stderr == ""


def test_the_recordings_are_small_enough_to_be_cloned_by_everybody() -> None:
    assert 6 <= len(FILES) <= 8
    assert sum(path.stat().st_size for path in FILES) < 3_000_000
