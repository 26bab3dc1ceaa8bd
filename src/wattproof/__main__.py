"""Chooses the command line or the window. Qt is imported only once it is known that a window can open."""

import contextlib
import os
import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING

os.environ.setdefault(
    "OPENBLAS_NUM_THREADS", "1"
)  # set before numpy loads; for blocks this small more threads only cost

from wattproof.cli.errors import complain, unforeseen_hook
from wattproof.cli.main import run

if TYPE_CHECKING:
    from wattproof.runner.watching import WatchRunner

NO_DISPLAY = 2


def main(arguments: Sequence[str] | None = None) -> int:
    """Carry out one call of the program and return its exit status."""
    return run(sys.argv[1:] if arguments is None else arguments, _open_window, _open_log)


def _open_window(bench: str) -> int:
    from wattproof.gui.display import missing_display_reason  # noqa: PLC0415 - a command needs no window

    reason = missing_display_reason()
    if reason is not None:
        complain(reason)
        return NO_DISPLAY
    from wattproof.app import open_watch  # noqa: PLC0415 - likewise
    from wattproof.gui.main import run as run_window  # noqa: PLC0415 - imports Qt, which aborts without a display

    _open_log()
    sys.excepthook = unforeseen_hook(_open_log)
    with contextlib.ExitStack() as on_exit:

        def make_runner() -> "WatchRunner":
            runner = open_watch(bench)
            on_exit.callback(runner.close)
            return runner

        return run_window(make_runner)


def _open_log() -> str:
    from wattproof.app import open_log  # noqa: PLC0415 - only a window or an unforeseen error needs the log

    return open_log()


if __name__ == "__main__":
    sys.exit(main())
