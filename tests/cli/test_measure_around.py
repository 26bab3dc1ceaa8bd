"""`wattproof measure` of what stands around the power statement, as a person and as a program call it."""

import json

import pytest

from wattproof.cli.main import run

OK, WRONG_USE = 0, 2


def call(*arguments: str) -> int:
    return run(["measure", *arguments], lambda _bench: OK, lambda: "")


def test_a_program_gets_one_document_and_a_quiet_stderr(capsys: pytest.CaptureFixture[str]) -> None:
    assert call("efficiency", "--levels-vrms", "1", "--read-s", "0.2", "--json") == OK
    out, err = capsys.readouterr()
    assert json.loads(out)["wattproof"] == "efficiency"
    assert err == ""


def test_a_person_gets_a_page(capsys: pytest.CaptureFixture[str]) -> None:
    assert call("idle", "--seconds", "2", "--channels", "1", "--set", "load=4") == OK
    out = capsys.readouterr().out
    assert out.startswith("Noise and hum at rest")
    assert "ITU-R BS.468-4" in out


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (("idle", "--set", "knob"), "give NAME=VALUE"),
        (("idle", "--set", "warp=9"), "no control 'warp'"),
        (("response", "--from-hz", "1000", "--to-hz", "1900"), "less than an octave"),
        (("output-resistance", "--loads", "4,8"), "the higher first"),
        (("crosstalk", "--channels", "1"), "crosstalk needs two"),
        (("efficiency", "--supply", "12"), "volts and amperes"),
        (("frequency", "--from-hz", "5"), "--from-hz"),
        (("gain", "--calibration", "nowhere.toml"), "nowhere.toml"),
    ],
)
def test_wrong_use_is_one_line_that_says_the_way_out(
    arguments: tuple[str, ...], told: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert call(*arguments) == WRONG_USE
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert told in err


@pytest.mark.parametrize(
    "name", ["response", "frequency", "idle", "gain", "output-resistance", "crosstalk", "efficiency"]
)
def test_each_command_explains_itself(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert call(name, "--help") == OK
    out = capsys.readouterr().out
    assert "Exit status" in out
    assert "--json" in out
