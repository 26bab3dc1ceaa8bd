"""`wattproof measure calibrate` as a person or a program calls it, and its refusals in one line."""

import json
from collections.abc import Sequence
from pathlib import Path

import pytest

from wattproof.app import calibration_folder
from wattproof.cli.main import run
from wattproof.store.calibration_file import read_calibration

QUICK = ("--sweep-s", "1", "--block-s", "0.25", "--most-blocks", "1")


def calibrate(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, str, str]:
    status = run(("measure", "calibrate", *arguments), lambda _: 0, lambda: "the.log")
    out, err = capsys.readouterr()
    return status, out, err


def test_the_simulated_bench_is_calibrated_and_its_record_stored(capsys: pytest.CaptureFixture[str]) -> None:
    status, out, err = calibrate(capsys, *QUICK, "--meter-percent", "0.5", "--meter-name", "blue")
    assert (status, err) == (0, "")
    assert "Calibration of simulated:class-d-bridge, 96 kHz, 24 bit" in out
    file = calibration_folder() / "simulated-class-d-bridge-96000.toml"
    assert f"Stored in {file}" in out
    record = read_calibration(file)
    assert record.inputs[0].full_scale_vrms.parts[0].source == "level calibration blue"
    assert record.in_floors


def test_json_is_one_ascii_document(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    file = tmp_path / "record.toml"
    status, out, err = calibrate(
        capsys, "--bench", "simulated:class-a-single", *QUICK, "--no-pad", "--json", "--output", str(file)
    )
    assert (status, err) == (0, "")
    assert out.isascii()
    document = json.loads(out)
    assert (document["wattproof"], document["version"], document["file"]) == ("calibration", 1, str(file))
    assert (document["floors"], len(document["loops"])) == ([], 2)
    assert file.is_file()


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("--highest-fs", "2"), "--highest-fs"),
        (("--meter-low-hz", "400", "--meter-high-hz", "50"), "is reversed or empty; look it up"),
        (("--meter-low-hz", "50", "--meter-high-hz", "55", *QUICK), "holds no frequency 7 Hz clear of the mains"),
        (("--bench", "simulated:none"), "no simulated amplifier is called"),
        (("--wired",), "--wired has nobody who plugs the pad; add --no-pad"),
        (("--rig", "nowhere"), "no rig is called 'nowhere'"),
        (("--rig", "nowhere.toml"), "nowhere.toml cannot be read"),
    ],
)
def test_wrong_use_is_one_line(capsys: pytest.CaptureFixture[str], arguments: Sequence[str], words: str) -> None:
    status, out, err = calibrate(capsys, *arguments)
    assert (status, out) == (2, "")
    assert err.count("\n") == 1
    assert words in err


def test_a_recording_cannot_be_calibrated(capsys: pytest.CaptureFixture[str]) -> None:
    recording = str(min((Path(__file__).parents[2] / "demo_recordings").glob("*.flac")))
    status, _, err = calibrate(capsys, "--bench", recording)
    assert status == 2
    assert "has no output; a calibration needs a device that plays and captures" in err


def test_a_record_that_cannot_be_stored_says_so(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    (tmp_path / "file").write_text("here", encoding="utf-8")
    status, _, err = calibrate(capsys, *QUICK, "--no-pad", "--no-meter", "--output", str(tmp_path / "file" / "x.toml"))
    assert status == 2
    assert "cannot be written" in err
