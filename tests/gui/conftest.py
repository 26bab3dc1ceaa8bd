"""The virtual display, the application, and a window on a runner that behaves."""

import os
import shutil
import subprocess
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

import pytest

from tests.gui.fake_runner import FakeRunner

if TYPE_CHECKING:  # Qt is imported only once there is a display: it aborts without
    from wattproof.gui.window import Window

Frames = Callable[[int], None]


@pytest.fixture(scope="session")
def display() -> Iterator[str]:
    """Return a free virtual X display, and end it afterwards."""
    if shutil.which("Xvfb") is None:
        pytest.skip("no Xvfb on this machine: apt-get install xvfb")
    reading_end, writing_end = os.pipe()
    server = subprocess.Popen(
        ["Xvfb", "-displayfd", str(writing_end), "-screen", "0", "1920x1080x24", "-nolisten", "tcp"],
        pass_fds=(writing_end,),
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    os.close(writing_end)
    try:
        with os.fdopen(reading_end) as told:
            number = told.readline().strip()
        assert number, "Xvfb ended before it named its display"
        yield f":{number}"
    finally:
        server.terminate()
        server.wait(timeout=10)


@pytest.fixture(scope="session")
def application(display: str) -> Iterator[object]:
    """Return the one Qt application, on the virtual display."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("DISPLAY", display)
        patch.setenv("QT_QPA_PLATFORM", "xcb")
        patch.delenv("WAYLAND_DISPLAY", raising=False)
        from PySide6.QtWidgets import QApplication  # noqa: PLC0415 - only once there is a display

        from wattproof.gui.theme import load_fonts  # noqa: PLC0415 - likewise

        app = QApplication(["wattproof"])
        app.setStyle("Fusion")
        load_fonts()
        yield app
        app.shutdown()


@pytest.fixture
def runner() -> FakeRunner:
    """Return a runner that behaves, with its tone on."""
    return FakeRunner()


@pytest.fixture
def window(application: object, runner: FakeRunner) -> "Iterator[Window]":
    """Return a shown window on the behaving runner. Its timer rests: the test says when a frame passes."""
    from wattproof.gui.theme import Choice, Theme  # noqa: PLC0415 - only once there is a display
    from wattproof.gui.window import Window  # noqa: PLC0415 - likewise

    assert application is not None
    shown = Window(runner, Theme(Choice.LIGHT))
    shown.timer.stop()
    shown.resize(1920, 1080)
    shown.show()
    shown.activateWindow()
    settle()
    yield shown
    shown.close()
    shown.deleteLater()
    settle()


@pytest.fixture
def frames(window: "Window", runner: FakeRunner) -> Frames:
    """Return a call that lets frames pass, each with a new block."""

    def pass_frames(count: int) -> None:
        for _ in range(count):
            runner.step()
            window.tick()
            settle()

    return pass_frames


def settle() -> None:
    """Let Qt do what it has in hand."""
    from PySide6.QtWidgets import QApplication  # noqa: PLC0415 - only once there is a display

    QApplication.processEvents()
