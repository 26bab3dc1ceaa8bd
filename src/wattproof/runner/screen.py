"""What a running procedure tells the screen: a mailbox for pictures, a list for everything else."""

import threading
from collections import deque

import attrs

from wattproof.core.notes import Note
from wattproof.core.reading import Reading
from wattproof.core.run import Ending
from wattproof.procedures.requests import Ask, Kept, Progress, Said, Shown


@attrs.frozen(eq=False)
class ReadingsTaken:
    """The readings of one block, one per channel: the trail is drawn from these."""

    readings: tuple[Reading, ...]


@attrs.frozen
class Asked:
    """A person is asked for something; answer with `Runner.answer(ask_id, …)`."""

    ask_id: int
    ask: Ask


@attrs.frozen
class Prompted:
    """A person may do something while the tone sounds; nobody waits for an answer."""

    ask: Ask


@attrs.frozen(eq=False)
class ReadingKept:
    """A reading was kept, and what for."""

    kept: Kept


@attrs.frozen
class Told:
    """The procedure found something out."""

    said: Said


@attrs.frozen
class Progressed:
    """How far the procedure is."""

    progress: Progress


@attrs.frozen
class Refused:
    """A block was refused: never averaged into a number."""

    note: Note


@attrs.frozen
class ToneChanged:
    """The tone was started, changed or silenced. `why` is empty where a person did it."""

    on: bool
    frequency_hz: float
    level_fs: float
    why: str = ""


@attrs.frozen
class Ended:
    """The run is over and the tone is silent."""

    ending: Ending
    why: str = ""


Event = ReadingsTaken | Asked | Prompted | ReadingKept | Told | Progressed | Refused | ToneChanged | Ended


class Screen:
    """Two ways from the run thread to the screen. Neither ever holds the measurement back."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._newest: Shown | None = None
        self._events: deque[Event] = deque()

    def show(self, shown: Shown) -> None:
        """Put the newest picture in the mailbox, over one that was not fetched."""
        with self._lock:
            self._newest = shown

    def tell(self, event: Event) -> None:
        """Append to the ordered list; nothing is dropped."""
        with self._lock:
            self._events.append(event)

    def newest(self) -> Shown | None:
        """Take the newest picture, or None where none came since the last call."""
        with self._lock:
            newest, self._newest = self._newest, None
        return newest

    def drain(self) -> list[Event]:
        """Take everything told since the last call, in order."""
        with self._lock:
            events = list(self._events)
            self._events.clear()
        return events
