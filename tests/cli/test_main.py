"""Each call of the program ends with a status and, where something is wrong, with one line that says what to do."""

import errno
import os
import subprocess
import sys
from collections.abc import Callable, Sequence
from pathlib import Path

import click
import pytest

from wattproof.cli.errors import unforeseen_hook
from wattproof.cli.main import COMMANDS, run, version, wattproof, with_wildcards
from wattproof.core.errors import BenchLostError, WrongUseError

SOURCE = Path(__file__).parents[2] / "src"
PROGRAM = (sys.executable, "-m", "wattproof")


class Called:
    """One call in this process, with a window that a test makes up."""

    def __init__(self, *arguments: str, window: Callable[[str], int] = lambda _: 0) -> None:
        self.benches: list[str] = []
        self._window = window
        self.status = run(arguments, self._open_window, lambda: "the.log")

    def _open_window(self, bench: str) -> int:
        self.benches.append(bench)
        return self._window(bench)


def failing(error: BaseException) -> Callable[[str], int]:
    """Return a window that fails when it opens."""

    def window(_: str) -> int:
        raise error

    return window


@pytest.mark.parametrize(
    ("arguments", "bench"),
    [
        ((), "simulated"),
        (("--bench", "simulated:class-a-single"), "simulated:class-a-single"),
        (("--bench=old tape.flac",), "old tape.flac"),
    ],
)
def test_without_a_command_the_window_opens_on_the_bench(arguments: Sequence[str], bench: str) -> None:
    called = Called(*arguments)
    assert (called.benches, called.status) == ([bench], 0)


def test_the_status_of_the_window_is_the_status_of_the_program() -> None:
    assert Called(window=lambda _: 143).status == 143


@pytest.mark.parametrize("option", ["--help", "-h"])
def test_help_is_printed(option: str, capsys: pytest.CaptureFixture[str]) -> None:
    called = Called(option)
    assert (called.status, called.benches) == (0, [])
    out, err = capsys.readouterr()
    assert "--bench" in out
    assert all(command in out for command in COMMANDS)
    assert err == ""


def test_the_version_is_printed(capsys: pytest.CaptureFixture[str]) -> None:
    assert Called("--version").status == 0
    assert capsys.readouterr().out == f"wattproof {version()}\n"


def test_every_command_that_is_named_exists() -> None:
    with wattproof.make_context("wattproof", []) as ctx:
        for name in COMMANDS:
            command = wattproof.get_command(ctx, name)
            assert isinstance(command, click.Command)
            assert command.name == name


@pytest.mark.parametrize(
    ("arguments", "line"),
    [
        (("bogus",), "wattproof: no such command 'bogus'; see wattproof --help"),
        (("--bogus",), "wattproof: no such option '--bogus'; see wattproof --help"),
        (("--bench",), "wattproof: option '--bench' requires an argument; see wattproof --help"),
        (("two\nlines",), "wattproof: no such command 'two\\nlines'; see wattproof --help"),
        (("--bench", "x", "read"), "wattproof: --bench belongs to the window; leave it out with read"),
        (("read",), "wattproof: read: FILE... is missing; see wattproof read --help"),
        (("read", "--seconds"), "wattproof: read: option '--seconds' requires an argument; see wattproof read --help"),
        (
            ("read", "--band", "x", "f"),
            "wattproof: read: --band: 'x' is no band in Hz; give LO-HI, for example 20-20000",
        ),
    ],
)
def test_wrong_use_is_one_line_with_status_2(
    arguments: Sequence[str], line: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert Called(*arguments).status == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith(line)
    assert err.count("\n") == 1


@pytest.mark.parametrize(
    ("error", "status", "line"),
    [
        (WrongUseError("no bench is named"), 2, "wattproof: no bench is named\n"),
        (BenchLostError("the device is gone\nfor good"), 2, "wattproof: the device is gone for good\n"),
        (KeyboardInterrupt(), 130, "wattproof: stopped by the keyboard\n"),
        (click.Abort(), 130, "wattproof: stopped by the keyboard\n"),
        (click.FileError("x.toml", "no access"), 2, "wattproof: Could not open file 'x.toml': no access\n"),
        (
            ZeroDivisionError("division\nby zero"),
            1,
            "wattproof: unforeseen ZeroDivisionError: division by zero; the details are in the.log\n",
        ),
        (
            OSError(errno.ENOSPC, "No space left on device"),
            2,
            "wattproof: standard output: no space left on device; give it a file or a program that takes all of it\n",
        ),
        (
            PermissionError(errno.EACCES, "Permission denied", "/x"),
            1,
            "wattproof: unforeseen PermissionError: [Errno 13] Permission denied: '/x'; the details are in the.log\n",
        ),
    ],
)
def test_what_is_raised_becomes_a_status_and_one_line(
    error: BaseException, status: int, line: str, capfd: pytest.CaptureFixture[str]
) -> None:
    assert Called(window=failing(error)).status == status
    assert capfd.readouterr().err == line


def test_without_a_log_file_the_line_says_so(capsys: pytest.CaptureFixture[str]) -> None:
    assert run([], failing(ZeroDivisionError("oh")), lambda: "") == 1
    assert capsys.readouterr().err.endswith("oh; no log file could be written\n")


def test_an_error_inside_the_window_is_one_line_too(capsys: pytest.CaptureFixture[str]) -> None:
    error = ZeroDivisionError("oh")
    unforeseen_hook(lambda: "the.log")(type(error), error, None)
    assert capsys.readouterr().err == "wattproof: unforeseen ZeroDivisionError: oh; the details are in the.log\n"


def test_wildcards_are_expanded_where_the_shell_does_not(tmp_path: Path) -> None:
    for name in ("b.wav", "a.wav"):
        (tmp_path / name).touch()
    pattern = str(tmp_path / "*.wav")
    expanded = [str(tmp_path / "a.wav"), str(tmp_path / "b.wav")]
    assert with_wildcards(["read", "--json", pattern, "none*.wav"]) == ["read", "--json", *expanded, "none*.wav"]


def _environment(**more: str) -> dict[str, str]:
    kept = {name: value for name, value in os.environ.items() if name not in ("DISPLAY", "WAYLAND_DISPLAY")}
    return kept | {"PYTHONPATH": str(SOURCE)} | more


def _program(*arguments: str | bytes, redirect: str = "", **environment: str) -> "subprocess.CompletedProcess[bytes]":
    """Run the program itself; `redirect` is what the shell does with its output."""
    command = ("sh", "-c", f'"$@" {redirect}', "sh", *PROGRAM, *arguments)
    return subprocess.run(command, env=_environment(**environment), capture_output=True, check=False, timeout=120)


@pytest.mark.skipif(os.name == "nt", reason="redirections of a POSIX shell")
@pytest.mark.parametrize(
    ("redirect", "line"),
    [
        (">&-", b"wattproof: standard output is closed; give it a file or a terminal to write to\n"),
        (
            ">/dev/full",
            b"wattproof: standard output: no space left on device; give it a file or a program that takes all of it\n",
        ),
    ],
)
def test_an_output_that_takes_nothing_is_one_line(redirect: str, line: bytes) -> None:
    done = _program("--help", redirect=redirect)
    assert (done.returncode, done.stderr) == (2, line)


def test_a_reader_that_goes_away_is_one_line() -> None:
    reading, writing = os.pipe()
    os.close(reading)
    try:
        done = subprocess.run(
            (*PROGRAM, "--help"), env=_environment(), stdout=writing, stderr=subprocess.PIPE, check=False, timeout=120
        )
    finally:
        os.close(writing)
    assert done.returncode == 2
    assert done.stderr == (
        b"wattproof: standard output: closed by its reader; give it a file or a program that takes all of it\n"
    )


def test_closed_standard_error_does_not_hide_the_status() -> None:
    done = _program("bogus", redirect="2>&-")
    assert (done.returncode, done.stdout) == (2, b"")


def test_a_name_of_any_bytes_in_a_c_locale_is_one_line_of_ascii() -> None:
    done = _program(b"caf\xe9\xff", LC_ALL="C", PYTHONUTF8="0", PYTHONCOERCECLOCALE="0")
    assert done.returncode == 2
    assert done.stderr.startswith(b"wattproof: no such command ")
    assert done.stderr.isascii()
    assert done.stderr.count(b"\n") == 1


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="other systems always have a display")
def test_a_missing_display_is_one_line_before_qt_starts() -> None:
    done = _program(QT_QPA_PLATFORM="")
    assert done.returncode == 2
    assert done.stderr.startswith(b"wattproof: no display: ")
    assert done.stderr.count(b"\n") == 1


def _loaded_by(*arguments: str) -> set[str]:
    code = "import sys\nfrom wattproof.__main__ import main\nmain(sys.argv[1:])\nprint(*sys.modules, file=sys.stderr)"
    command = (sys.executable, "-c", code, *arguments)
    done = subprocess.run(command, env=_environment(), capture_output=True, text=True, check=True, timeout=120)
    return set(done.stderr.split())


def test_a_call_that_measures_nothing_loads_no_numbers_and_no_window() -> None:
    loaded = _loaded_by("--version")
    assert "wattproof.cli.main" in loaded
    assert loaded & {"numpy", "scipy", "PySide6", "sounddevice", "soundfile", "rich"} == set()


@pytest.mark.parametrize("bench", ["simulated:nope", "no such device"])
def test_a_bench_that_cannot_be_opened_is_one_line(bench: str) -> None:
    done = _program("--bench", bench, QT_QPA_PLATFORM="offscreen")
    assert done.returncode == 2
    assert done.stderr.startswith(b"wattproof: ")
    assert done.stderr.count(b"\n") == 1
