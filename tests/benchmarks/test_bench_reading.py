"""The benchmark runs and prints its table; how fast the machine is, is no matter of a test."""

import os
import subprocess
import sys
from pathlib import Path

from tests.benchmarks.bench_reading import GOALS, Row, rows, table

SCRIPT = Path(__file__).with_name("bench_reading.py")


def test_every_goal_has_its_rows() -> None:
    found = rows(pairs=2)
    assert {row.seconds for row in found} == set(GOALS)
    assert all(row.ratio > 0.0 for row in found)
    assert all(row.goal is not None for row in found)


def test_the_table_says_beside_each_ratio_whether_its_goal_is_met() -> None:
    text = table([Row("following", 1.0, 5.0, 6.0, 9.0, 1.8), Row("from cold", 1.0, 13.0, 12.0, 23.0, 1.8)])
    lines = text.splitlines()
    assert lines[1].split() == ["following", "1", "s", "5.0", "≤", "6", "9.00", "ms", "1.80", "ms", "met"]
    assert lines[2].endswith("missed")


def test_the_script_runs_by_itself() -> None:
    source = SCRIPT.parents[2] / "src"
    environment = {**os.environ, "PYTHONPATH": str(source), "PYTHONIOENCODING": "utf-8"}
    done = subprocess.run(
        [sys.executable, SCRIPT],
        capture_output=True,
        text=True,
        encoding="utf-8",
        env=environment,
        timeout=120,
        check=True,
    )
    lines = done.stdout.splitlines()
    assert len(lines) == 1 + 3 * len(GOALS)
    assert all("≤" in line for line in lines[1:])
    assert done.stderr == ""
