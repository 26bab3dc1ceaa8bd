"""`wattproof attenuator` prints a plan, writes a drawing, and refuses what cannot be in one line."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

from wattproof.__main__ import main

USUAL = ["--power", "100", "--load", "8", "--full-scale-vrms", "4", "--input-impedance", "10000"]


def attenuator(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, str, str]:
    status = main(["attenuator", *arguments])
    out, err = capsys.readouterr()
    return status, out, err


def test_a_plan_is_a_page(capsys: pytest.CaptureFixture[str]) -> None:
    status, out, err = attenuator(capsys, *USUAL, "--rail", "45")
    assert (status, err) == (0, "")
    assert out.startswith("Attenuator, single-ended: 100 W into 8.00 Ω\n")
    assert "R1a     4.64 kΩ" in out


def test_json_is_one_ascii_document(capsys: pytest.CaptureFixture[str]) -> None:
    status, out, err = attenuator(capsys, *USUAL, "--bridge", "--json")
    assert (status, err) == (0, "")
    assert out.isascii()
    document = json.loads(out)
    assert (document["wattproof"], document["topology"]) == ("attenuator", "bridge-tied")
    assert document["settings"]["tolerance"] == 0.001


def test_the_series_is_the_one_that_is_asked_for(capsys: pytest.CaptureFixture[str]) -> None:
    _, out, _ = attenuator(capsys, *USUAL, "--series", "E24", "--json")
    two_digits = {f"{part['ohm']:.1e}" for part in json.loads(out)["parts"]}
    assert {float(text) for text in two_digits} == {part["ohm"] for part in json.loads(out)["parts"]}


def test_per_cents_become_ratios(capsys: pytest.CaptureFixture[str]) -> None:
    _, out, _ = attenuator(capsys, *USUAL, "--tolerance", "0.5", "--input-tolerance", "2", "--json")
    settings = json.loads(out)["settings"]
    assert settings["tolerance"] == pytest.approx(0.005, rel=1e-12, abs=0)
    assert settings["input_tolerance"] == pytest.approx(0.02, rel=1e-12, abs=0)


def test_the_drawing_is_written(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    file = tmp_path / "circuit.svg"
    status, _, err = attenuator(capsys, *USUAL, "--svg", str(file))
    assert (status, err) == (0, "")
    assert file.read_text(encoding="utf-8").startswith("<svg xmlns=")


@pytest.mark.parametrize(
    ("more", "named", "way_out"),
    [
        (["--power", "-3"], '--power: "-3"', "give a number from 0.001 to 100000 W"),
        (["--power", "nan"], '--power: "nan"', "give a number from 0.001"),
        (["--load", "8 ohm"], '--load: "8 ohm"', "give a number from 0.5"),
        (["--full-scale-vrms", "0"], '--full-scale-vrms: "0"', "give a number from 0.01"),
        (["--input-impedance", "1"], '--input-impedance: "1"', "give a number from 100"),
        (["--series", "E12"], "--series: 'E12'", "'E24', 'E96'"),
        (["--tolerance", "50"], "--tolerance: '50'", "give per cent from 0.0001 to 10"),
        (["--tolerance", "one"], "--tolerance: 'one'", "give per cent"),
        (["--rail", "20"], "rail is 20 V", "give at least that, or less power"),
        (["--two-inputs"], "two inputs are for a bridge-tied output", "leave them out"),
        (["--power", "1e5"], "power 100000 W into load 8 Ω", "use a high-voltage probe"),
        (
            ["--svg", "/no/such/folder/x.svg"],
            "--svg: /no/such/folder/x.svg",
            "give a file in a folder that you may write",
        ),
        (["--bogus"], "--bogus", "see wattproof attenuator --help"),
    ],
)
def test_wrong_use_is_one_line_with_the_option_the_value_and_the_way_out(
    capsys: pytest.CaptureFixture[str], more: list[str], named: str, way_out: str
) -> None:
    status, out, err = attenuator(capsys, *USUAL, *more)
    assert (status, out) == (2, "")
    assert err.count("\n") == 1
    assert err.startswith("wattproof: attenuator: ")
    assert named in err
    assert way_out in err


@pytest.mark.parametrize("missing", ["--power", "--load", "--full-scale-vrms", "--input-impedance"])
def test_a_missing_option_is_named(capsys: pytest.CaptureFixture[str], missing: str) -> None:
    place = USUAL.index(missing)
    status, _, err = attenuator(capsys, *USUAL[:place], *USUAL[place + 2 :])
    assert status == 2
    assert err == f"wattproof: attenuator: {missing} is missing; see wattproof attenuator --help\n"


def test_help_warns_and_names_every_option(capsys: pytest.CaptureFixture[str]) -> None:
    status, out, _ = attenuator(capsys, "--help")
    assert status == 0
    told = " ".join(out.split())
    for option in (*USUAL[::2], "--bridge", "--series", "--json", "--svg", "--rail", "--clamp-pf", "--two-inputs"):
        assert option in told
    assert "can destroy the amplifier" in told


def test_a_plain_locale_gets_plain_characters() -> None:
    done = subprocess.run(
        [sys.executable, "-m", "wattproof", "attenuator", *USUAL],
        env={"PYTHONPATH": "src", "LC_ALL": "C", "PYTHONIOENCODING": "ascii"},
        capture_output=True,
        check=False,
    )
    assert (done.returncode, done.stderr) == (0, b"")
    assert done.stdout.isascii()
    assert b"8.00 ohm" in done.stdout


def test_planning_loads_neither_a_sound_library_nor_scipy() -> None:
    code = (
        "import sys; from wattproof.__main__ import main; main(sys.argv[1:]); "
        "print([name for name in ('sounddevice', 'soundfile', 'scipy') if name in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, "attenuator", *USUAL], env={"PYTHONPATH": "src"}, capture_output=True, check=False
    )
    assert done.stdout.splitlines()[-1] == b"[]"
