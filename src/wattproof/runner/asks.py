"""What a person, or a bench that can do it, is asked for, and the waiting for the answer."""

import threading

from wattproof.core.errors import StoppedError, WrongUseError


class Asks:
    """Numbers the questions of all runs and hands each answer to the thread that waits for it."""

    def __init__(self) -> None:
        self._changed = threading.Condition()
        self._number = 0
        self._open: int | None = None
        self._given: float | str | None = None

    def open(self) -> int:
        """Open a question and return its number, by which it is answered."""
        with self._changed:
            self._number += 1
            self._open, self._given = self._number, None
            return self._number

    def wait(self, stop: threading.Event) -> float | str:
        """Wait until the open question is answered, and close it.

        Raises:
            StoppedError: `stop` was set, and `wake` called, before the answer came.
        """
        with self._changed:
            self._changed.wait_for(lambda: self._given is not None or stop.is_set())
            given, self._given, self._open = self._given, None, None
        if given is None:
            raise StoppedError("")
        return given

    def wake(self) -> None:
        """Let the waiting thread look at its stop event."""
        with self._changed:
            self._changed.notify_all()

    def answer(self, ask_id: int, value: float | str) -> None:
        """Answer the open question. From any thread.

        Raises:
            WrongUseError: that question is not open, or no longer.
        """
        with self._changed:
            if ask_id != self._open or self._given is not None:
                raise WrongUseError(f"question {ask_id} is not open; answer the one that was asked last")
            self._given = value
            self._changed.notify_all()
