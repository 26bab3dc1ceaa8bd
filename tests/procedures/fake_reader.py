"""A live reader that behaves: it reads the level of each channel, and shortens its blocks while that moves."""

import numpy as np

from wattproof.core.picture import Picture
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture, Samples
from wattproof.core.units import DB_PER_RELATIVE

STILL_S = 0.25
MOVING_S = 0.05
SILENT_FS = 1e-6


class FakeReader:
    """Remembers every block and every restart."""

    def __init__(self, rate_hz: float, settings: tuple[ReadingSettings, ...]) -> None:
        self.rate_hz = rate_hz
        self.settings = settings
        self.next_frames = round(STILL_S * rate_hz)
        self.spans: list[tuple[int, int]] = []
        self.restarts: list[float | None] = []
        self.unfit_blocks = 0  # how many of the next blocks give no reading

    def restart(self, frequency_hz: float | None) -> None:
        self.restarts.append(frequency_hz)
        self.next_frames = round(STILL_S * self.rate_hz)

    def take(self, capture: Capture, picture_channel: int | None) -> tuple[tuple[Reading, ...], Picture | None]:
        self.spans.append((capture.first_frame, capture.span.end_frame))
        if self.unfit_blocks:
            self.unfit_blocks -= 1
            return (), None
        channels = range(1, capture.channels + 1)
        readings = tuple(self._read(capture, channel) for channel in channels)
        moving = any(reading.moving_db_per_s for reading in readings)
        self.next_frames = round((MOVING_S if moving else STILL_S) * self.rate_hz)
        return readings, _picture(readings[picture_channel - 1]) if picture_channel else None

    def _read(self, capture: Capture, channel: int) -> Reading:
        column = capture.samples[:, channel - 1]
        early, late = (_rms(half) for half in np.array_split(column, 2))
        level = _rms(column)
        moving = DB_PER_RELATIVE * (late - early) / level / (capture.span.seconds / 2) if level > SILENT_FS else 0.0
        overloaded = any(overload.channel == channel for overload in capture.overloads)
        state = State.OVERLOAD if overloaded else State.OK if level > SILENT_FS else State.NO_TONE
        settings = self.settings[channel - 1]
        level_fs = measured(level * 2**0.5, 0.0, "1")
        full_scale = settings.full_scale_vrms
        return Reading(
            span=capture.span,
            channel=channel,
            settings=settings,
            state=state,
            level_fs=level_fs,
            level_vrms=None if full_scale is None else level_fs.scaled(full_scale, "V"),
            moving_db_per_s=moving if abs(moving) > 0.5 else 0.0,
        )


def _rms(samples: Samples) -> float:
    return float(np.sqrt(np.mean(samples**2)))


def _picture(reading: Reading) -> Picture:
    nothing = np.zeros(0)
    return Picture(reading, nothing, nothing, nothing, nothing, nothing, 1.0, "none")
