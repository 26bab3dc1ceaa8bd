"""What holds for every test: one numeric thread, its own folders, nothing left running, no skip where none is due."""

import os
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import hypothesis
import pytest

NO_SKIPS = "WATTPROOF_NO_SKIPS"  # set by .ci/run, where everything that a test may need is installed
_GRACE_S = 5.0  # what a thread or child that was told to end may still take on a slow machine

for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")

# No deadline: a busy machine is no fault of the code. The same examples every time: a red run can be looked at again.
hypothesis.settings.register_profile("house", deadline=None, derandomize=True)
hypothesis.settings.load_profile("house")

_skipped: list[str] = []


@pytest.fixture(autouse=True, scope="session")
def own_folders(tmp_path_factory: pytest.TempPathFactory) -> Iterator[None]:
    """Keep the tests, and the programs they start, out of the folders of the person who runs them."""
    patch = pytest.MonkeyPatch()
    for kind in ("CONFIG", "DATA", "STATE", "CACHE"):
        patch.setenv(f"XDG_{kind}_HOME", str(tmp_path_factory.mktemp(kind.lower())))
    yield
    patch.undo()


@pytest.fixture(autouse=True)
def nothing_left_running() -> Iterator[None]:
    """Fail a test that leaves a thread or a child process behind."""
    before = _running()
    yield
    deadline = time.monotonic() + _GRACE_S
    while (left := _running() - before) and time.monotonic() < deadline:
        time.sleep(0.01)
    assert not left, f"left running: {', '.join(sorted(left))}"


def _running() -> set[str]:
    threads = {f"thread {thread.name} {thread.ident}" for thread in threading.enumerate()}
    return threads | {f"process {pid} {command}" for pid, command in _children().items()}


def _children() -> dict[str, str]:
    """Return pid and command line of each child process (where /proc tells), zombies left out."""
    found = {}
    for listing in Path("/proc/self/task").glob("*/children"):
        try:
            pids = listing.read_text().split()
        except OSError:  # the thread has just ended
            continue
        for pid in pids:
            try:
                command = Path(f"/proc/{pid}/cmdline").read_text().replace("\0", " ").strip()
            except OSError:
                continue
            if command and "resource_tracker" not in command:  # Python's own, which ends with the test run
                found[pid] = command
    return found


@pytest.hookimpl
def pytest_runtest_logreport(report: pytest.TestReport) -> None:
    """Remember each skip."""
    if report.skipped and not hasattr(report, "wasxfail"):
        _skipped.append(report.nodeid)


@pytest.hookimpl
def pytest_collectreport(report: pytest.CollectReport) -> None:
    """Remember each module that was skipped as a whole."""
    if report.skipped:
        _skipped.append(report.nodeid)


@pytest.hookimpl
def pytest_sessionfinish(session: pytest.Session) -> None:
    """Let a run with a skip fail where none is due."""
    if _skipped and os.environ.get(NO_SKIPS) and session.exitstatus == pytest.ExitCode.OK:
        session.exitstatus = pytest.ExitCode.TESTS_FAILED


@pytest.hookimpl
def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    """Say which skip made the run fail."""
    if _skipped and os.environ.get(NO_SKIPS):
        terminalreporter.section(f"{NO_SKIPS} is set, and these were skipped", sep="!", red=True)
        for nodeid in _skipped:
            terminalreporter.line(nodeid)
