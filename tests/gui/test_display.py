"""What keeps a window from opening is told in one line, before Qt is imported."""

import socket
import subprocess
import sys

import pytest

from wattproof.gui.display import missing_display_reason

pytestmark = pytest.mark.skipif(
    not sys.platform.startswith("linux"), reason="other systems have a display wherever a program runs"
)


def test_no_display_is_told_in_one_line_and_qt_is_not_imported() -> None:
    script = (
        "import sys; from wattproof.gui.display import missing_display_reason as reason; print(reason());"
        " print(sorted(name for name in sys.modules if name.startswith('PySide6')))"
    )
    done = subprocess.run(
        [sys.executable, "-c", script], env={"PYTHONPATH": "src"}, capture_output=True, text=True, check=True
    )
    reason, modules = done.stdout.splitlines()
    assert "no display" in reason
    assert "DISPLAY" in reason
    assert modules == "[]"


def test_a_display_that_nobody_serves_is_named() -> None:
    reason = missing_display_reason({"DISPLAY": ":97531"})
    assert reason is not None
    assert ":97531" in reason
    assert "\n" not in reason


@pytest.mark.parametrize("display", ["nonsense", ":", "host:", ":-1", ":0x"])
def test_a_display_that_is_no_display_is_refused(display: str) -> None:
    assert missing_display_reason({"DISPLAY": display}) is not None


def test_a_wayland_name_without_a_socket_is_no_display(tmp_path_factory: pytest.TempPathFactory) -> None:
    folder = tmp_path_factory.mktemp("runtime")
    environment = {"WAYLAND_DISPLAY": "wayland-7", "XDG_RUNTIME_DIR": str(folder)}
    assert missing_display_reason(environment) is not None
    with socket.socket(socket.AF_UNIX) as server:
        server.bind(str(folder / "wayland-7"))
        server.listen()
        assert "no display" not in (missing_display_reason(environment) or "")


def test_a_missing_library_is_named_with_its_package(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("wattproof.gui.display._loads", lambda library: library != "libEGL.so.1")
    reason = missing_display_reason({"QT_QPA_PLATFORM": "offscreen"})
    assert reason is not None
    assert "libEGL.so.1" in reason
    assert "apt-get install libegl1" in reason


@pytest.mark.display
def test_a_served_display_is_accepted(display: str) -> None:
    assert missing_display_reason({"DISPLAY": display}) is None
    assert missing_display_reason({"QT_QPA_PLATFORM": "offscreen"}) is None
