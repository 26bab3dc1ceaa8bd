"""Does one piece of work in a thread that can never keep the program from ending, and hands the outcome over."""

import threading
from collections.abc import Callable
from typing import Generic, TypeVar

Result = TypeVar("Result")


class Background(Generic[Result]):
    """A piece of work on its way. `take` is to be called once it is `done`."""

    def __init__(self, work: Callable[[], Result], name: str) -> None:
        self._work = work
        self._result: list[Result] = []
        self._error: BaseException | None = None
        self._thread = threading.Thread(target=self._run, name=name, daemon=True)
        self._thread.start()

    @property
    def done(self) -> bool:
        """Whether it has an outcome."""
        return not self._thread.is_alive()

    def take(self) -> Result:
        """Return the result.

        Raises:
            BaseException: whatever the work raised.
        """
        if self._error is not None:
            raise self._error
        return self._result[0]

    def _run(self) -> None:
        try:
            self._result.append(self._work())
        except BaseException as error:  # noqa: BLE001 - handed over to whoever takes the outcome
            self._error = error
