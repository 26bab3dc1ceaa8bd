"""A live reader that states what stands at the amplifier's terminals, whatever reads the blocks behind it."""

from collections.abc import Callable

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading
from wattproof.core.rig import Rig
from wattproof.core.signal import Capture
from wattproof.procedures.absolute import absolute
from wattproof.procedures.watch import Reader


class TerminalReader:
    """Reads as `reader` does and brings each reading to volts and watts, with budgets and limits.

    `rig_now` tells what is wired as the switches stand. The drive is not known here, so the converter-out counts with
    the worst of its levels.
    """

    def __init__(self, reader: Reader, rig_now: Callable[[], Rig], calibration: Calibration) -> None:
        self._reader = reader
        self._rig_now = rig_now
        self._calibration = calibration

    @property
    def next_frames(self) -> int:
        """How long the next block should be, in frames."""
        return self._reader.next_frames

    def take(self, capture: Capture, picture_channel: int | None) -> tuple[tuple[Reading, ...], Picture | None]:
        """Read a block: one reading per channel, and the picture of one."""
        raw, picture = self._reader.take(capture, picture_channel)
        rig = self._rig_now()
        readings = tuple(absolute(reading, rig, self._calibration) for reading in raw)
        if picture is not None and picture_channel is not None:
            picture = attrs.evolve(picture, reading=readings[picture_channel - 1])
        return readings, picture

    def restart(self, frequency_hz: float | None) -> None:
        """Forget what was followed; start from a frequency, or look for one where it is None."""
        self._reader.restart(frequency_hz)
