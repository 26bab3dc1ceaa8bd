"""The README keeps its promises: the job first, a working session early, two commands, and .ci/run does the same."""

import os
import re
import subprocess
import sys

from tests.house.sources import ROOT, pyproject

_README = (ROOT / "README.md").read_text(encoding="utf-8")
_CI = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
_INSTALL = r"^python3 -m venv \.venv && \.venv/bin/pip install .+$"


def _set_up_commands() -> list[str]:
    return re.findall(_INSTALL, _README, flags=re.MULTILINE)


def _packages(text: str) -> set[str]:
    return set(text.replace("\\\n", " ").split())


def test_there_are_exactly_two_set_up_commands() -> None:
    opens, tests = _set_up_commands()
    assert opens.endswith("&& .venv/bin/wattproof")
    assert tests.endswith("pip install -e '.[test]' && .venv/bin/pytest")


def test_the_ci_runs_the_readmes_test_command() -> None:
    _, tests = _set_up_commands()
    assert f"\n{tests} || status=$?\n" in _CI


def test_the_ci_installs_the_packages_of_the_readmes_apt_line() -> None:
    named = re.search(r"^sudo apt-get install -y ((?:.|\\\n)+?)$", _README, flags=re.MULTILINE)
    listed = re.search(r"^packages=\((.+?)\)$", _CI, flags=re.MULTILINE | re.DOTALL)
    assert named
    assert listed
    assert _packages(named[1]) == _packages(listed[1])


def test_a_working_session_stands_by_the_fortieth_line() -> None:
    session = [
        n for n, line in enumerate(_README.splitlines(), 1) if line.startswith("$ ") and "wattproof read" in line
    ]
    assert session
    assert session[0] <= 40


def test_the_ci_can_be_run() -> None:
    assert (ROOT / ".ci" / "run").stat().st_mode & 0o111


def test_every_option_of_read_is_explained() -> None:
    import click  # noqa: PLC0415 - only this test looks at the program

    from wattproof.cli.read import read  # noqa: PLC0415 - likewise

    assert isinstance(read, click.Command)
    options = [option for parameter in read.params for option in parameter.opts if option.startswith("--")]
    assert options
    assert [option for option in options if f"`{option}" not in _README] == []


def test_the_readme_is_the_packages_description() -> None:
    assert pyproject()["project"]["readme"] == "README.md"


def test_the_session_is_what_the_program_prints() -> None:
    told = re.search(r"^\$ \.venv/bin/wattproof (.+)\n((?s:.+?))^```$", _README, flags=re.MULTILINE)
    assert told
    environment = {name: value for name, value in os.environ.items() if name != "COLUMNS"}
    done = subprocess.run(
        [sys.executable, "-m", "wattproof", *told[1].split()],
        cwd=ROOT,
        env={**environment, "PYTHONPATH": str(ROOT / "src"), "PYTHONUTF8": "1", "LC_ALL": "C.UTF-8"},
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.strip() == told[2].strip()
