"""Drives a procedure to its ending: answers its requests, hands on its records, and stops it where it yields."""

import threading
from collections.abc import Callable

from wattproof.core.errors import BenchLostError, StoppedError, WattproofError
from wattproof.core.run import Ending
from wattproof.core.signal import Capture
from wattproof.procedures.requests import Procedure, Record, Request, Wishes

Answer = int | float | str | Capture | Wishes | None
RECORDS_AFTER_STOP = 1000  # what a stopped procedure may still tell; more is a procedure that does not end


class Drive:
    """One pass through a procedure.

    `answer` answers a request and may raise a WattproofError, which is thrown at the procedure's yield; `record` takes
    what it tells. A procedure that was stopped, or whose bench is lost, may still yield records; a further request
    closes it.
    """

    def __init__(
        self,
        procedure: Procedure,
        answer: Callable[[Request], Answer],
        record: Callable[[Record], None],
        stop: threading.Event,
    ) -> None:
        self._procedure = procedure
        self._answer = answer
        self._record = record
        self._stop = stop
        self._last_word: WattproofError | None = None  # why the procedure gets no further answer

    def run(self) -> tuple[Ending, str]:
        """Drive the procedure to its end and return how it ended and why.

        Raises:
            Exception: whatever else than a WattproofError the procedure, its analysis or the bench raised.
        """
        try:
            self._drive()
        except WattproofError as error:
            self._last_word = self._last_word or error
        finally:
            self._close()
        if self._last_word is None:
            return Ending.DONE, ""
        if isinstance(self._last_word, StoppedError):
            return Ending.STOPPED, str(self._last_word)  # empty where a person stopped it, who knows why
        return Ending.FAILED, str(self._last_word)

    def _drive(self) -> None:
        told = 0
        try:
            item = next(self._procedure)
            while True:
                if self._last_word is not None:
                    told += 1
                    if not isinstance(item, Record) or told > RECORDS_AFTER_STOP:
                        return
                item = self._step(item)
        except StopIteration:
            return

    def _step(self, item: Request | Record) -> Request | Record:
        try:
            answer = self._take(item)
        except WattproofError as error:
            if isinstance(error, StoppedError | BenchLostError):
                self._last_word = error
            return self._procedure.throw(error)
        return self._procedure.send(answer)

    def _take(self, item: Request | Record) -> Answer:
        answer: Answer = None
        if isinstance(item, Record):
            self._record(item)
        elif not self._stop.is_set():
            answer = self._answer(item)
        if self._stop.is_set() and self._last_word is None:
            raise StoppedError("")
        return answer

    def _close(self) -> None:
        try:
            self._procedure.close()
        except RuntimeError:  # it yielded again when it was closed: it is left to the collector
            return
