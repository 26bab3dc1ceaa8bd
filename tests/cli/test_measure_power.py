"""`wattproof measure power` and `power-by-hand`: documents, statuses, refusals, and a Ctrl-C that leaves silence."""

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from wattproof.bench.simulated.truth import Truth
from wattproof.cli.main import run
from wattproof.cli.measure import PROCEDURES, measure
from wattproof.core.fields import fields_of
from wattproof.core.units import db
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan

SOURCE = Path(__file__).parents[2] / "src"
QUICK = ("--hold-s", "0", "--step-db", "3", "--read-s", "0.4")


def call(*arguments: str) -> int:
    return run(arguments, lambda _bench: 0, lambda: "the.log")


def test_power_prints_one_document_and_nothing_else(capfd: pytest.CaptureFixture[str]) -> None:
    status = call("measure", "power", "--bench", "simulated:class-a-single", "--claimed-w", "50", *QUICK, "--json")
    out, err = capfd.readouterr()
    assert (status, err) == (0, "")
    made: dict[str, Any] = json.loads(out)
    assert (made["wattproof"], made["version"], made["ending"]) == ("power", 1, "done")
    row = made["statement"][0]
    assert (row["channel"], row["load_ohm"], row["driven"], row["claimed_w"]) == (1, 8.0, [1], 50.0)
    volts = {point["at"]: point["voltage_vrms"]["value"] for point in row["points"]}
    truth = Truth("class-a-single")
    assert abs(db(volts["1 %"] / truth.vrms_at_thdn(0.01))) < 0.01
    assert abs(db(volts["10 %"] / truth.vrms_at_thdn(0.10))) < 0.01


def test_power_by_hand_prints_a_table(capfd: pytest.CaptureFixture[str]) -> None:
    status = call("measure", "power-by-hand", "--hold-s", "0", "--strokes", "1", "--hand-db-per-s", "40")
    out, err = capfd.readouterr()
    assert (status, err) == (0, "")
    assert "Power statement" in out
    assert "10 %" in out
    assert "momentary" in out


def test_a_point_that_cannot_be_reached_is_a_result(capfd: pytest.CaptureFixture[str]) -> None:
    status = call("measure", "power", "--drive-vrms", "0.01", *QUICK, "--json")
    out, _ = capfd.readouterr()
    assert status == 0
    points = json.loads(out)["statement"][0]["points"]
    assert [point["power_w"] for point in points] == [None, None, None]
    assert all(point["why"] for point in points)


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("power", "--loads", "eight"), "loads"),
        (("power", "--frequency-hz", "10000"), "bursts"),
        (("power", "--hold-s", "-1"), "hold"),
        (("power", "--bench", "simulated:nobody"), "nobody"),
        (("power", "--bench", "no such device"), "no such device"),
        (("power", "--rig", "nowhere"), "nowhere"),
        (
            (
                "power",
                "--nonsense",
            ),
            "nonsense",
        ),
        (("power-by-hand", "--strokes", "3"), "strokes"),
        (("nothing",), "nothing"),
        (("power", "--loads", "1000000", "--valve"), "valve"),
    ],
)
def test_wrong_use_is_one_line_and_status_2(
    arguments: tuple[str, ...], said: str, capfd: pytest.CaptureFixture[str]
) -> None:
    status = call("measure", *arguments)
    out, err = capfd.readouterr()
    assert status == 2
    assert out == ""
    assert len(err.splitlines()) == 1
    assert said in err


@pytest.mark.parametrize(("name", "kind"), [("power", StepsPlan), ("power-by-hand", HandPlan)])
def test_every_setting_is_an_option_and_help_says_what_is_done_asked_and_limited(
    name: str, kind: type[PowerPlan], capfd: pytest.CaptureFixture[str]
) -> None:
    assert call("measure", name, "--help") == 0
    text = " ".join(capfd.readouterr().out.split())
    for field in fields_of(kind):
        assert "--" + field.name.replace("_", "-") in text
    for words in ("What it does", "What it asks", "What it limits", "Exit status", "non-negative least-squares"):
        assert words in text
    assert "conform" not in text.lower()


def test_the_group_lists_its_procedures(capfd: pytest.CaptureFixture[str]) -> None:
    assert call("measure", "--help") == 0
    out = capfd.readouterr().out
    assert all(name in out for name in PROCEDURES)
    assert measure.name == "measure"


def test_ctrl_c_leaves_silence_and_prints_what_was_kept() -> None:
    command = (sys.executable, "-m", "wattproof", "measure", "power", "--hold-s", "3600", "--json")
    started = subprocess.Popen(
        command,
        env={**os.environ, "PYTHONPATH": str(SOURCE)},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    time.sleep(8.0)  # long enough for the first readings on a slow machine, and an hour before the end
    started.send_signal(signal.SIGINT)
    out, err = started.communicate(timeout=60)
    assert started.returncode == 1, err
    made = json.loads(out)
    assert (made["ending"], made["why"]) == ("stopped", "stopped by the keyboard")
    assert len(made["curve"]) > 0
    assert len(err.splitlines()) == 1


def test_a_recording_is_followed_as_if_it_were_live_and_drives_nothing(capfd: pytest.CaptureFixture[str]) -> None:
    file = str(Path(__file__).parents[2] / "demo_recordings" / "01-tag-31-healthy.flac")
    assert call("measure", "power", "--bench", file, "--full-scale-vrms", "40") == 2
    assert "no output to drive" in capfd.readouterr().err
    assert call("measure", "power-by-hand", "--bench", file) == 2
    assert "--full-scale-vrms" in capfd.readouterr().err
    status = call("measure", "power-by-hand", "--bench", file, "--full-scale-vrms", "40", "--json")
    made = json.loads(capfd.readouterr().out)
    assert (status, made["ending"]) == (1, "failed")  # it is over before the control was turned
    assert "ended" in made["why"] or "end" in made["why"]
    assert made["curve"][0]["voltage_vrms"] == pytest.approx(12.649, rel=1e-3, abs=0.0)  # −10 dB of 40 V
