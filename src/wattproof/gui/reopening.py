"""Lets go of a bench and opens another one, or the same again, in a thread, so that the window lives meanwhile."""

from collections.abc import Callable

from wattproof.gui.background import Background
from wattproof.gui.driven import Driven


class Reopening:
    """One opening at a time. The bench before is closed first: the same device can't be opened twice."""

    def __init__(self, runner: Driven, open_watch: Callable[[str], Driven]) -> None:
        self._runner = runner
        self._open_watch = open_watch
        self._job: Background[Driven] | None = None

    @property
    def under_way(self) -> bool:
        """Whether one is being opened."""
        return self._job is not None

    def begin(self, named: str) -> None:
        """Begin to open a bench, as the command line names it."""
        close = getattr(self._runner, "close", self._runner.stop)

        def reopened() -> Driven:
            close()
            return self._open_watch(named)

        self._job = Background(reopened, "wattproof-open")

    def take(self) -> Driven | None:
        """Return the new runner once it is there, None before.

        Raises:
            WattproofError: the bench could not be opened.
        """
        job = self._job
        if job is None or not job.done:
            return None
        self._job = None
        return job.take()
