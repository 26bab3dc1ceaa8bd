"""How fast the drive may rise: from silence to −60 dBFS at once, from there by so many dB a second."""

import math

from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Tone
from wattproof.core.units import db, from_db

START_FS = from_db(-60.0)
PLACE_KEPT_S = 5.0  # a pause of a burst test keeps the level that was reached; a longer silence starts anew
_ROUNDING = 1.0 + 1e-6


class DriveSlew:
    """Refuses a tone that would rise faster than a stated rate. Time is that of the captured frames, in s."""

    def __init__(self, rise_db_per_s: float) -> None:
        if not (math.isfinite(rise_db_per_s) and rise_db_per_s > 0.0):
            raise WrongUseError(f"rise {rise_db_per_s:g} dB/s: give a rate above zero")
        self._rate = rise_db_per_s
        self._level_fs = 0.0
        self._loud_until_s = -math.inf
        self._since_s = -math.inf
        self._silent = True

    def restart(self) -> None:
        """Begin anew from silence: a new run, or somebody switched something meanwhile."""
        self._level_fs, self._silent, self._loud_until_s = 0.0, True, -math.inf

    def highest_fs(self, now_s: float) -> float:
        """Return the highest level that may sound now, as a ratio to full scale."""
        if self._silent and now_s - self._loud_until_s > PLACE_KEPT_S:
            return START_FS
        if self._level_fs == 0.0:
            return START_FS
        return max(START_FS, self._level_fs * from_db(self._rate * max(now_s - self._since_s, 0.0)))

    def check(self, tone: Tone, now_s: float) -> None:
        """Accept a tone that does not rise faster than the rate.

        Raises:
            WrongUseError: it would; the line names the level and the rate.
        """
        highest = self.highest_fs(now_s)
        if tone.level_fs > highest * _ROUNDING:
            raise WrongUseError(
                f"drive {db(tone.level_fs):.1f} dBFS: rises faster than {self._rate:g} dB/s; {db(highest):.1f} dBFS "
                "may sound now"
            )

    def played(self, tone: Tone, stands_s: float) -> None:
        """Say that a tone was given to the bench, and from when it stands."""
        if tone.level_fs == 0.0:
            if not self._silent:
                self._loud_until_s = stands_s
            self._silent = True
            return
        self._level_fs, self._since_s, self._silent = tone.level_fs, stands_s, False
