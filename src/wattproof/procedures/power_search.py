"""The readings of one row with the drives that made them, and where the drive must go to meet a point."""

import math
from itertools import pairwise

import attrs
import numpy as np

from wattproof.core.reading import Reading
from wattproof.dsp.onset import NoOnset, Onset, find_onset
from wattproof.dsp.power_curve import Dominated, Point, curve_of, point_of

_LEAST_SLOPE = 0.3  # d ln THD+N / d ln drive: flatter than that no trim is taken from
_NEIGHBOUR = 1.06  # 0.5 dB: readings this far outside a bracket may still tell how the curve runs
_INSIDE = 0.02  # of a bracket's width: a secant that comes nearer to an end has gone astray
_ANY_SLOPE = 8.0  # a clipping amplifier's, where a bracket has no slope of its own any more


@attrs.frozen
class Bracket:
    """Two drives around a point, with the THD+N that each gave (plain ratios): the lower one below its value."""

    low_fs: float
    low_thdn: float
    high_fs: float
    high_thdn: float

    @property
    def width(self) -> float:
        """Log ratio of the two drives."""
        return math.log(self.high_fs / self.low_fs)

    @property
    def slope(self) -> float:
        """Return d ln THD+N / d ln drive, straight between the two."""
        return max(math.log(self.high_thdn / self.low_thdn) / self.width, _LEAST_SLOPE)

    def drive_at(self, thdn: float, inside: float = 0.0) -> float:
        """Return the drive for a THD+N, straight in log-log, at least `inside` of the width away from both ends."""
        share = math.log(thdn / self.low_thdn) / math.log(self.high_thdn / self.low_thdn)
        return self.low_fs * math.exp(self.width * min(max(share, inside), 1.0 - inside))

    def drive_beyond(self, thdn: float) -> float:
        """Return the drive for a THD+N on the straight line in log-log through both, inside or outside of them."""
        return self.low_fs * math.exp(math.log(thdn / self.low_thdn) / self.slope)

    def narrowed(self, drive_fs: float, given: float, thdn: float) -> "Bracket":
        """Return the bracket with a new reading of `given` at a drive as its lower or upper end."""
        if given < thdn:
            return Bracket(drive_fs, given, self.high_fs, self.high_thdn)
        return Bracket(self.low_fs, self.low_thdn, drive_fs, given)

    def widened(self, by: float) -> "Bracket":
        """Return the bracket with both ends further out by a log ratio of drive, THD+N carried along its slope."""
        step, least = math.exp(by), math.exp(_ANY_SLOPE * by)
        return Bracket(self.low_fs / step, self.low_thdn / least, self.high_fs * step, self.high_thdn * least)


class Search:
    """What is known of a row so far."""

    def __init__(self) -> None:
        self._known: list[tuple[float, Point]] = []

    def add(self, drive_fs: float, reading: Reading) -> Point | None:
        """Take a reading at a drive, and return it as a point; None where it is none."""
        point = point_of(reading)
        if point is not None:
            self._known.append((drive_fs, point))
            self._known.sort(key=lambda pair: pair[0])
        return point

    @property
    def points(self) -> list[Point]:
        """All points by rising drive."""
        return [point for _, point in self._known]

    @property
    def lowest_fs(self) -> float:
        """The lowest drive that was read."""
        return self._known[0][0]

    @property
    def top(self) -> tuple[float, Point]:
        """The highest drive that was read, and what it gave."""
        return self._known[-1]

    def rising(self) -> bool:
        """Whether distortion has begun to rise towards clipping: harmonics above 0.3 %, more than a step before."""
        if len(self._known) < 2:
            return False
        (_, before), (_, last) = self._known[-2:]
        return last.dominated is Dominated.HARMONICS and last.thdn > max(before.thdn, 0.003)

    def onset(self) -> Onset | NoOnset:
        """The onset of clipping as the readings so far have it."""
        return find_onset(curve_of(self.points))

    def bracket(self, thdn: float) -> Bracket | None:
        """Return the two drives between which THD+N rises through a value the last time, or None."""
        for (low_fs, low), (high_fs, high) in reversed(list(pairwise(self._known))):
            if low.thdn < thdn <= high.thdn and low_fs < high_fs:
                return Bracket(low_fs, low.thdn, high_fs, high.thdn)
        return None

    def drive_near(self, thdn: float) -> float | None:
        """Return the drive for a THD+N by the secant of the two nearest readings, or the bracket's middle; or None.

        The straight line across a bracket alone would come near from one side only, ever more slowly.
        """
        bracket = self.bracket(thdn)
        if bracket is None:
            return None
        near = sorted(self._known, key=lambda pair: abs(math.log(pair[1].thdn / thdn)))
        around = [pair for pair in near if bracket.low_fs / _NEIGHBOUR <= pair[0] <= bracket.high_fs * _NEIGHBOUR][:2]
        (first_fs, first), (second_fs, second) = sorted(around, key=lambda pair: pair[0])
        if second.thdn <= first.thdn or second_fs <= first_fs:
            return bracket.drive_at(thdn)
        wanted = Bracket(first_fs, first.thdn, second_fs, second.thdn).drive_beyond(thdn)
        margin = math.exp(_INSIDE * bracket.width)
        if bracket.low_fs * margin <= wanted <= bracket.high_fs / margin:
            return wanted
        return math.sqrt(bracket.low_fs * bracket.high_fs)

    def drive_at_voltage(self, vrms: float) -> float:
        """Return the drive that gives an output voltage, straight in log-log between the readings."""
        volts = np.log([point.voltage_vrms for _, point in self._known])
        drives = np.log([drive for drive, _ in self._known])
        return float(np.exp(np.interp(math.log(vrms), volts, drives)))
