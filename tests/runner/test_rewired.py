"""When the load is switched, no block from before the switch is read with the load from after it."""

import numpy as np

from tests.procedures.fake_reader import FakeReader
from wattproof.core.reading import ReadingSettings
from wattproof.core.signal import Capture
from wattproof.runner.rewired import RewiredReader

EIGHT = (ReadingSettings(full_scale_vrms=10.0, load_ohm=8.0),)
FOUR = (ReadingSettings(full_scale_vrms=10.0, load_ohm=4.0),)
RATE_HZ = 48_000.0


class Table:
    """A rewired reader, the switch that it follows, and the readers that it made."""

    def __init__(self) -> None:
        self.settings = EIGHT
        self.made: list[FakeReader] = []
        self.reader = RewiredReader(lambda: self.settings, self._new)

    def _new(self, settings: tuple[ReadingSettings, ...]) -> FakeReader:
        self.made.append(FakeReader(RATE_HZ, settings))
        return self.made[-1]

    def loads(self, first_frame: int) -> list[float | None]:
        capture = Capture(np.ones((100, 1)), RATE_HZ, first_frame)
        readings, _ = self.reader.take(capture, 1)
        return [reading.settings.load_ohm for reading in readings]


def test_as_long_as_nothing_is_switched_one_reader_reads_on() -> None:
    table = Table()
    table.reader.restart(997.0)
    assert [table.loads(first) for first in (0, 40, 80)] == [[8.0], [8.0], [8.0]]
    assert len(table.made) == 1
    assert table.reader.next_frames == table.made[0].next_frames


def test_blocks_that_reach_back_before_the_switch_are_left_out() -> None:
    table = Table()
    table.loads(0)
    table.settings = FOUR
    assert [table.loads(first) for first in (40, 80, 120, 139, 140, 180)] == [[], [], [], [], [4.0], [4.0]]


def test_the_new_reader_starts_from_the_tone_that_sounds() -> None:
    table = Table()
    table.reader.restart(313.0)
    table.settings = FOUR
    table.loads(0)
    assert table.made[1].restarts == [313.0]
