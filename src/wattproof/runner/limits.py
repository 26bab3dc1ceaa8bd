"""The limits that are never exceeded: the drive before it sounds, the amplifier's output once it is read."""

import threading

from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.reading import Reading
from wattproof.core.rig import Limits, Rig
from wattproof.core.signal import Tone
from wattproof.core.units import db

DEFAULT_DRIVE_LIMIT_FS = 0.1  # common practice, no source: −20 dBFS is below 1.3 V rms on outputs of up to +24 dBu
HIGHEST_LIMIT_VRMS = 50.0  # as `Limits.drive_vrms` declares it
_ROUNDING = 1.0 + 1e-9  # a level computed from the limit itself may come out a few ulp above it


class DriveLimit:
    """The most that the outputs may drive, in V rms, or as a ratio to full scale where the volts are not known.

    A person sets it; nothing in the program raises it. Every method may be called from any thread.
    """

    def __init__(self, rig: Rig, calibration: Calibration, limit_fs: float = DEFAULT_DRIVE_LIMIT_FS) -> None:
        self._calibration = calibration
        self._lock = threading.Lock()
        self._vrms = rig.limits.drive_vrms
        self._fs = limit_fs

    @property
    def vrms(self) -> float:
        """The limit in V rms, in force on outputs whose full scale is known."""
        with self._lock:
            return self._vrms

    @property
    def fs(self) -> float:
        """The limit as a ratio to full scale, in force on outputs whose full scale is not known."""
        with self._lock:
            return self._fs

    def set_vrms(self, limit_vrms: float) -> None:
        """Set the limit in V rms.

        Raises:
            WrongUseError: not from 0 to 50 V rms.
        """
        if not 0.0 <= limit_vrms <= HIGHEST_LIMIT_VRMS:
            raise WrongUseError(f"drive limit {limit_vrms:g} V rms: give 0 to {HIGHEST_LIMIT_VRMS:g} V rms")
        with self._lock:
            self._vrms = limit_vrms

    def set_fs(self, limit_fs: float) -> None:
        """Set the limit as a ratio to full scale.

        Raises:
            WrongUseError: not from 0 to 1.
        """
        if not 0.0 <= limit_fs <= 1.0:
            raise WrongUseError(f"drive limit {limit_fs:g} of full scale: give 0 to 1")
        with self._lock:
            self._fs = limit_fs

    def ceiling_fs(self, outputs: tuple[int, ...]) -> float:
        """Return the highest level that all of these outputs may sound, as a ratio to full scale, at most 1."""
        return min((self._ceiling_of(output) for output in outputs), default=1.0)

    def allows(self, tone: Tone) -> bool:
        """Return whether no output of the tone would sound above the limit."""
        return tone.level_fs <= self.ceiling_fs(tone.outputs) * _ROUNDING

    def check(self, tone: Tone) -> None:
        """Accept a tone that no output of it would sound above the limit.

        Raises:
            WrongUseError: it would; the line names the output, the drive and the limit.
        """
        for output in tone.outputs:
            if tone.level_fs > self._ceiling_of(output) * _ROUNDING:
                raise WrongUseError(self._refusal(tone.level_fs, output))

    def _ceiling_of(self, output: int) -> float:
        scale = self._calibration.output_vrms(output)
        if scale is None:
            return self.fs
        return min(1.0, self.vrms / scale.value)

    def _refusal(self, level_fs: float, output: int) -> str:
        scale = self._calibration.output_vrms(output)
        if scale is None:
            drive, limit = f"{db(level_fs):.1f} dBFS", f"{db(self.fs):.1f} dBFS"
        else:
            drive, limit = f"{level_fs * scale.value:.3g} V rms", f"{self.vrms:.3g} V rms"
        return f"output {output}: drive {drive} is above the limit of {limit}; lower the drive, or raise the limit"


def exceeded(reading: Reading, limits: Limits) -> str:
    """Return which of the rig's limits a reading is above, as one line; empty where it is above none."""
    watched = (
        ("output", "V rms", reading.level_vrms, limits.output_vrms),
        ("power", "W", reading.power_w, limits.power_w),
        ("THD+N", "of the reference", reading.thdn, limits.thdn),
    )
    for name, unit, quantity, limit in watched:
        if quantity is not None and limit is not None and quantity.value > limit:
            return f"channel {reading.channel}: {name} {quantity.value:.3g} {unit} is above the limit of {limit:.3g}"
    return ""


class OverRating:
    """Counts for how long each channel's power was above its load's rating, from readings that may overlap."""

    def __init__(self) -> None:
        self._until: dict[int, int] = {}
        self._over_s: dict[int, float] = {}

    def after(self, readings: tuple[Reading, ...], rig: Rig) -> str:
        """Take the readings of a block and return, as one line, which load was above its rating too long."""
        limit_s = rig.limits.over_rating_s
        if limit_s is None:
            return ""
        for wiring in rig.wirings:
            reading = next((each for each in readings if each.channel == wiring.input), None)
            rated_w = wiring.load.rated_w
            if reading is None or rated_w is None:
                continue
            new = max(reading.span.end_frame - max(self._until.get(wiring.input, 0), reading.span.first_frame), 0)
            self._until[wiring.input] = reading.span.end_frame
            if reading.power_w is not None and reading.power_w.value > rated_w:
                over_s = self._over_s.get(wiring.input, 0.0) + new / reading.span.rate_hz
                self._over_s[wiring.input] = over_s
                if over_s > limit_s:
                    return f"channel {reading.channel}: above the load's {rated_w:g} W for more than {limit_s:g} s"
        return ""
