"""The checks of style, types and import rules, run as tests so that one command runs them all."""

import subprocess
import sys

from tests.house.linting import broken_contracts
from tests.house.sources import ROOT


def _passes(*command: str) -> None:
    done = subprocess.run([sys.executable, *command], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr


def test_ruff_finds_nothing() -> None:
    _passes("-m", "ruff", "check", "src", "tests")


def test_ruff_would_format_nothing() -> None:
    _passes("-m", "ruff", "format", "--check", "src", "tests")


def test_mypy_strict_finds_nothing() -> None:
    _passes("-m", "mypy")


def test_import_contracts_are_kept() -> None:
    broken, report = broken_contracts(ROOT)
    assert not broken, report
