"""Opens the window on a runner and sees to it that every way out is silent."""

import signal
import sys
from collections.abc import Callable
from types import FrameType, TracebackType

from PySide6.QtCore import QSize
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QApplication

from wattproof.app import make_watch_runner, open_bench
from wattproof.gui import text
from wattproof.gui.driven import Driven
from wattproof.gui.theme import Theme, load_fonts
from wattproof.gui.window import Window

_SIGNALS = ("SIGINT", "SIGTERM", "SIGHUP")  # SIGHUP is missing on Windows
_LARGEST = QSize(1920, 1080)


def run(source: str | Callable[[], Driven]) -> int:
    """Open the window, stay until it is closed, and return the exit status.

    `source` is a bench in words, as `app.open_bench` takes it, or a call that makes the runner. The runner is stopped
    on every way out: a closed window, an error of the program's own (status 1), SIGINT, SIGTERM or SIGHUP (128 and the
    signal's number, as shells count).

    Raises:
        WattproofError: the bench can't be opened; no window has been opened then.
    """
    if isinstance(source, str):
        runner = make_watch_runner(open_bench(source))
        try:
            return show(lambda: runner)
        finally:
            runner.close()
    return show(source)


def show(make_runner: Callable[[], Driven]) -> int:
    """Do the same for a runner that is yet to be made; what it opened is left to whoever made it."""
    app = _application()
    runner = make_runner()
    exits = Exits(runner)
    exits.watch()
    shown = Shown(exits)
    try:
        try:
            shown.open(Window(runner, Theme()))
            app.exec()
        finally:
            shown.close()
    finally:
        runner.stop()
        exits.unwatch()
    return exits.status


class Shown:
    """The window that is open; another bench gets a new one in the same place, with the trail that was drawn."""

    def __init__(self, exits: "Exits") -> None:
        self._exits = exits
        self._window: Window | None = None
        self._later: list[Driven] = []  # runners that were opened from inside, so theirs to close

    def open(self, window: Window) -> None:
        """Show a window in the place of the one before."""
        before, self._window = self._window, window
        self._exits.window, self._exits.runner = window, window.runner
        window.replaced.connect(self._replace)
        if before is None:
            window.resize(QGuiApplication.primaryScreen().availableSize().boundedTo(_LARGEST))
            window.show()
            return
        window.setGeometry(before.geometry())
        window.setWindowState(before.windowState())
        window.show()
        before.close()
        before.deleteLater()

    def close(self) -> None:
        """Close the window, and every bench that was opened from inside."""
        if self._window is not None:
            self._window.close()
        for runner in self._later:
            getattr(runner, "close", runner.stop)()

    def _replace(self, runner: Driven) -> None:
        self._later.append(runner)
        window = self._window
        if window is not None:
            self.open(Window(runner, window.theme, trail=window.trail))


def _application() -> QApplication:
    app = QApplication.instance() or QApplication([text.TITLE])
    if not isinstance(app, QApplication):
        raise TypeError("a Qt application without windows is running; the window needs a QApplication")
    app.setApplicationName(text.TITLE)
    app.setStyle("Fusion")
    load_fonts()
    return app


class Exits:
    """Watches signals and unhandled errors while the window is open; both silence the tone first."""

    def __init__(self, runner: Driven) -> None:
        self.runner = runner
        self.window: Window | None = None
        self.status = 0
        self._before: dict[int, object] = {}
        self._hook = sys.excepthook

    def watch(self) -> None:
        """Take over. The window's timer lets Python see a signal within one frame."""
        for name in _SIGNALS:
            number = getattr(signal, name, None)
            if number is not None:
                self._before[number] = signal.signal(number, self._signalled)
        self._hook = sys.excepthook
        sys.excepthook = self._failed

    def unwatch(self) -> None:
        """Give everything back as it was."""
        for number, before in self._before.items():
            signal.signal(number, before)  # type: ignore[arg-type]  # it is what signal.signal returned
        sys.excepthook = self._hook

    def _signalled(self, number: int, _frame: FrameType | None) -> None:
        self._leave(128 + number)

    def _failed(self, kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        try:
            self._leave(1)
        finally:
            self._hook(kind, error, trace)

    def _leave(self, status: int) -> None:
        self.runner.mute()
        if self.window is not None:
            self.window.board.stop()
        self.status = self.status or status
        if self.window is not None:
            self.window.close()
            QApplication.quit()
