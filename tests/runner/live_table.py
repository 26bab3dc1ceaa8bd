"""A runner on a fake bench, and everything that it told so far."""

import time
from collections.abc import Iterator
from contextlib import contextmanager

import pytest

from tests.runner.fake_bench import FakeBench
from wattproof.core.rig import Limits, Rig
from wattproof.core.signal import Tone
from wattproof.procedures.requests import Acquire, Play, Procedure
from wattproof.runner.live import Keeper, Runner
from wattproof.runner.screen import Ended, Event

TONE = Tone(997.0, 0.4)
TIMEOUT_S = 20.0


class Table:
    """A runner on a fake bench, and everything that it told so far."""

    def __init__(self, *, auto: bool = True, limits: Limits | None = None, keeper: Keeper | None = None) -> None:
        self.bench = FakeBench(auto=auto)
        self.rig = Rig(limits=limits or Limits(drive_vrms=1.0))
        self.runner = Runner(self.bench, self.rig, self.bench.calibration, keeper=keeper)
        self.told: list[Event] = []

    def until(self, kind: type[Event]) -> Event:
        """Wait until an event of a kind is told and return it."""
        deadline = time.monotonic() + TIMEOUT_S
        while time.monotonic() < deadline:
            for event in self.runner.screen.drain():
                self.told.append(event)
                if isinstance(event, kind):
                    return event
            time.sleep(0.001)
        pytest.fail(f"no {kind.__name__} within {TIMEOUT_S} s; told: {self.told}")

    def ending(self, procedure: Procedure) -> Ended:
        self.runner.start(procedure)
        return self.ended()

    def ended(self) -> Ended:
        event = self.until(Ended)
        assert isinstance(event, Ended)
        assert not self.runner.running
        return event


@contextmanager
def opened() -> Iterator[Table]:
    """Lay a table, and let go of everything afterwards, even of a bench that hangs."""
    table = Table()
    yield table
    table.bench.hangs.clear()
    table.runner.close()


def play_and_wait() -> Procedure:
    """Sound a tone and capture until stopped."""
    yield Play(TONE)
    while True:
        yield Acquire(480)
