"""A runner that watches: whatever ended or muted the last watch, wishing for the tone begins a new one."""

from collections.abc import Callable

import attrs

from wattproof.bench.protocol import Bench
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Rig
from wattproof.procedures.requests import Procedure
from wattproof.runner.live import Runner


class WatchRunner(Runner):
    """Runs one watch after the other; `new_watch` makes each of them.

    `rig_now` tells the rig as the bench's own switches stand. Its limits count once, at the start: from then on they
    are a person's.
    """

    def __init__(
        self,
        bench: Bench,
        rig_now: Callable[[], Rig],
        calibration: Calibration,
        new_watch: Callable[[], Procedure],
    ) -> None:
        super().__init__(bench, rig_now(), calibration)
        self._rig_now = rig_now
        self._new_watch = new_watch
        self.reopen: Callable[[], Bench] | None = None  # how the bench is opened anew after it was lost

    @property
    def rig(self) -> Rig:
        """The rig as its switches stand, with the limits in force."""
        return attrs.evolve(self._rig_now(), limits=super().rig.limits)

    def begin(self) -> None:
        """Start to watch, with the wishes as they stand.

        Raises:
            WrongUseError: a watch is under way.
        """
        self.start(self._new_watch())

    def reconnect(self, reopen: Callable[[], Bench] | None = None) -> None:
        """Open the bench anew after it was lost, and watch on: wishes and limits stay, the tone is off until wished.

        `reopen` opens it otherwise than at first, at another rate for example. Where this fails it may be tried again.

        Raises:
            WrongUseError: the device refuses, it is another one, or nobody knows how to open it.
            BenchLostError: the sound system does not answer.
        """
        opening = reopen or self.reopen
        if opening is None:
            raise WrongUseError("this bench cannot be opened anew; close the program and start it again")
        self.stop()
        self.bench.close()
        bench = opening()
        try:
            self.take_bench(bench)
        except WrongUseError:
            bench.close()
            raise
        self.reopen = opening
        self.begin()

    def wish(
        self,
        *,
        tone_on: bool | None = None,
        frequency_hz: float | None = None,
        level_fs: float | None = None,
        channel: int | None = None,
    ) -> None:
        """Change what is wanted; what is None stays. Wishing for the tone after a mute begins a new watch.

        Raises:
            WrongUseError: a value that the bench cannot do, or a drive above the limit.
        """
        anew = bool(tone_on) and self.begun and (self.muted or not self.running)
        if not anew:
            super().wish(tone_on=tone_on, frequency_hz=frequency_hz, level_fs=level_fs, channel=channel)
            return
        self.stop()
        try:
            super().wish(tone_on=tone_on, frequency_hz=frequency_hz, level_fs=level_fs, channel=channel)
        finally:
            self.begin()
