"""The amplifier's volume control, followed as a hand-turned potentiometer moves: quickly, but never in a jump."""

import numpy as np

from wattproof.bench.simulated.characters import Scratch
from wattproof.bench.simulated.recursion import Smoother
from wattproof.core.signal import Samples

LOWEST_DB = -60.0
SMOOTHING_S = 0.002  # of each of two stages: 99 % of a turn is done within 14 ms; invented, as a carbon track feels
SETTLED_DB = 1e-9


class Knob:
    """Where the control stands, in dB below full gain, and how it gets to where it is turned."""

    def __init__(self, position_db: float, rate_hz: float, frames: int, scratches: tuple[Scratch, ...] = ()) -> None:
        self._rate_hz, self._frames, self._scratches = rate_hz, frames, scratches
        self._stages = [Smoother(SMOOTHING_S * rate_hz, frames) for _ in range(2)]
        self._db_per_frame = 0.0
        self.place(position_db)

    def place(self, position_db: float) -> None:
        """Stand at a position without a way there (before anything is captured)."""
        self._position_db = self._target_db = position_db
        for stage in self._stages:
            stage.state = np.asarray(position_db)

    def turn(self, target_db: float, per_second: float | None = None) -> None:
        """Move towards target_db from the next chunk on: at once, or by per_second dB/s."""
        self._target_db = target_db
        self._db_per_frame = per_second / self._rate_hz if per_second else 0.0
        if not per_second:
            self._position_db = target_db

    def gains(self) -> float | Samples:
        """Return the voltage gain over the next chunk: one number where it stands still, else shape (frames,)."""
        at_rest = all(abs(float(stage.state) - self._target_db) < SETTLED_DB for stage in self._stages)
        if at_rest and self._position_db == self._target_db:
            return float(10.0 ** (self._target_db / 20.0))
        turning = self._position_db != self._target_db
        path = self._path()
        for stage in self._stages:
            path = stage.push(path)
        if turning and self._scratches:
            path = path - self._lost_db(path)
        return np.asarray(10.0 ** (path / 20.0), dtype=np.float64)

    def _lost_db(self, path: Samples) -> Samples:
        """Return what a dirty track takes away while the control is turned; at rest its wiper makes contact."""
        lost = np.zeros(path.size)
        for scratch in self._scratches:
            lost[np.abs(path - scratch.position_db) < 0.5 * scratch.width_db] += scratch.loss_db
        return lost

    def _path(self) -> Samples:
        """Return where the hand holds the control over the next chunk, in dB."""
        start, target = self._position_db, self._target_db
        if start == target:
            return np.full(self._frames, target)
        step = self._db_per_frame if target > start else -self._db_per_frame
        path: Samples = start + step * np.arange(1, self._frames + 1, dtype=np.float64)
        path = np.asarray(np.clip(path, min(start, target), max(start, target)), dtype=np.float64)
        self._position_db = float(path[-1])
        return path
