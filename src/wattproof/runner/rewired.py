"""A live reader that follows the rig: once a load switch is turned, blocks are read with the load that is in."""

from collections.abc import Callable

from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, ReadingSettings
from wattproof.core.signal import Capture
from wattproof.procedures.watch import Reader


class RewiredReader:
    """Reads with the settings that `settings_now` gives; a block from before the last change gives no reading."""

    def __init__(
        self,
        settings_now: Callable[[], tuple[ReadingSettings, ...]],
        new_reader: Callable[[tuple[ReadingSettings, ...]], Reader],
    ) -> None:
        self._settings_now = settings_now
        self._new_reader = new_reader
        self._settings = settings_now()
        self._reader = new_reader(self._settings)
        self._frequency_hz: float | None = None
        self._fit_from = 0

    @property
    def next_frames(self) -> int:
        """How long the next block should be, in frames."""
        return self._reader.next_frames

    def take(self, capture: Capture, picture_channel: int | None) -> tuple[tuple[Reading, ...], Picture | None]:
        """Read a block, or return no reading where the wiring was still another one at its beginning."""
        settings = self._settings_now()
        if settings != self._settings:
            self._settings = settings
            self._reader = self._new_reader(settings)
            self._reader.restart(self._frequency_hz)
            self._fit_from = capture.span.end_frame
        if capture.first_frame < self._fit_from:
            return (), None
        return self._reader.take(capture, picture_channel)

    def restart(self, frequency_hz: float | None) -> None:
        """Forget what was followed; start from a frequency, or look for one where it is None."""
        self._frequency_hz = frequency_hz
        self._reader.restart(frequency_hz)
