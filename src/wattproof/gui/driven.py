"""What the window needs of a runner: the interface that it drives, real or played by a test."""

from typing import Protocol

from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.rig import Rig
from wattproof.procedures.requests import Wishes
from wattproof.runner.limits import DriveLimit
from wattproof.runner.screen import Screen


class Driven(Protocol):
    """A runner that watches a bench. Every method may be called from the window's thread and none waits long."""

    @property
    def screen(self) -> Screen:
        """Where pictures and events are fetched."""
        ...

    @property
    def bench(self) -> Bench:
        """The bench, for its identity and its own controls."""
        ...

    @property
    def rig(self) -> Rig:
        """What is wired, with the limits that a person set."""
        ...

    @property
    def running(self) -> bool:
        """Whether it watches, or has ended."""
        ...

    @property
    def limit(self) -> DriveLimit:
        """The drive limit in force."""
        ...

    @property
    def calibration(self) -> Calibration:
        """What is known of the interface's scales."""
        ...

    @property
    def wishes(self) -> Wishes:
        """What is wanted now."""
        ...

    def wish(
        self,
        *,
        tone_on: bool | None = None,
        frequency_hz: float | None = None,
        level_fs: float | None = None,
        channel: int | None = None,
    ) -> None:
        """Change what is wanted.

        Raises:
            WrongUseError: the drive limit would be exceeded.
        """
        ...

    def mute(self) -> None:
        """Silence at once, from any thread."""
        ...

    def set_drive_limit_vrms(self, value: float) -> None:
        """Set the most that the output may drive, in V rms."""
        ...

    def set_drive_limit_fs(self, value: float) -> None:
        """Set the same as a ratio to full scale, for outputs whose volts are not known."""
        ...

    def stop(self, deadline_s: float = 2.0) -> None:
        """Fall silent and end."""
        ...

    def begin(self) -> None:
        """Watch again after a stop, in silence."""
        ...

    def kept(self) -> int:
        """Return how many readings were stored."""
        ...
