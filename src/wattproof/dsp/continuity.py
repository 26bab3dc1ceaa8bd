"""Whether frames are missing, double or replaced, by the tone's own content: the only witness that proves or clears.

A loss or a repetition of N frames turns a tone's phase by 2πfN/rate, so the phase along short pieces steps and stays;
replaced frames disturb a few pieces and leave the rest in place. What a step too small to be found does to a reading is
less than the noise that hides it.
"""

import math

import attrs
import numpy as np

from wattproof.core.signal import Samples
from wattproof.dsp.pieces import Phasors, Pieces

MOST_LOST = 1_024  # frames: every loss up to this is to be found
SURE = 5.0  # a step this many standard deviations high is no noise; the deviation itself is known to some per cent
STRANGE = 8.0  # pieces are tried by the hundred, and their distribution has longer tails than a mean's
LEAST_TURN = 5e-4  # rad; slow drift of two clocks or of a warm amplifier makes steps below it
COLOURED = 1.5  # times what white noise does to steps over NEAR pieces
TWIST = 0.02  # rad, of a piece that nobody suspected
HURT = 0.7  # of the level: a piece that lost more is a bad contact's, whose phase says nothing
ZERO_RUN = 8  # frames; a tone's own crossing gives one or two
NEAR = 8  # pieces to each side of a suspect stretch without which nothing is said of it
STILL = 0.012  # 0.1 dB: a level that moved more has only its nearest pieces compared
MOVING_TWIST = 0.008  # rad; what a turning control does to the phase stays below
_SIDES = (4, 8, 16, 40, 100)  # pieces to a side, tried one after the other
_OVERLAP = 1.155  # √(1 + 2/6): neighbours of half-overlapped Hann pieces correlate by a sixth
_BLUR = 12.0  # pieces times (scatter/step)²: how far off a small step may be placed, by trial
_NOTHING = 1e-14  # of the tone's power, −140 dB: below is the rounding of numbers
_BENDS = 4.667  # 6 − 8/6: variance of second differences of such pieces, in that of one


@attrs.frozen
class Break:
    """Frames missing, double or replaced within a stretch; `step_rad` is the phase that stays turned (0: replaced)."""

    first_frame: int
    frames: int
    step_rad: float


@attrs.frozen
class Verdict:
    """What the content says of a stretch: the break that it proves, or that there is none, or neither."""

    found: Break | None = None
    clear: bool = False


def zeros(samples: Samples) -> tuple[int, int] | None:
    """Return the first run of ZERO_RUN or more frames, shape (frames, channels), that are exactly zero, and its length.

    No converter that a tone goes into gives any: they were put in the place of frames that never came.
    """
    rests = np.flatnonzero(np.concatenate([[True], samples.any(axis=1), [True]]))
    runs = np.diff(rests) - 1
    where = np.flatnonzero(runs >= ZERO_RUN)
    return (int(rests[where[0]]), int(runs[where[0]])) if where.size else None


def least_step_rad(frequency_hz: float, rate_hz: float) -> float:
    """Return the smallest phase step that a loss of 1…MOST_LOST frames makes; 0 where some are whole periods."""
    turns = frequency_hz / rate_hz * np.arange(1, MOST_LOST + 1)
    return float(2.0 * math.pi * np.abs(turns - np.round(turns)).min())


class Continuity:
    """Follows one tone through an unbroken capture and judges it."""

    def __init__(self, rate_hz: float, frequency_hz: float) -> None:
        self.pieces = Pieces(rate_hz, frequency_hz)
        self.least_rad = least_step_rad(frequency_hz, rate_hz)

    def look(self, first_frame: int, end_frame: int) -> Verdict:
        """Look for a break anywhere in a stretch that nobody suspects; it is never called clear."""
        phases = self._phases()
        if phases is None:
            return Verdict()
        found = self._step(phases, first_frame, end_frame)
        return Verdict(found or self._strange(phases, first_frame, end_frame, TWIST))

    def judge(self, first_frame: int, end_frame: int) -> Verdict:
        """Prove or clear a suspect stretch, NEAR pieces or more before and after which have been taken."""
        phases = self._phases()
        if phases is None or not self._surrounded(phases, first_frame, end_frame):
            return Verdict()
        found = self._step(phases, first_frame, end_frame) or self._strange(phases, first_frame, end_frame, 0.0)
        if found is not None:
            return Verdict(found)
        return Verdict(clear=self._limit(phases, first_frame, end_frame) <= self.least_rad)

    @property
    def hears(self) -> bool:
        """Whether the tone is there and clear."""
        return self._phases() is not None

    def _phases(self) -> "_Phases | None":
        return phases_of(self.pieces.amplitude, self.pieces.rest, self.pieces.leak / 4.0)

    def _range(self, phases: "_Phases", first_frame: int, end_frame: int) -> tuple[int, int]:
        """Return the pieces, first and behind the last, that share a frame with a stretch."""
        hop, origin = self.pieces.hop, self.pieces.origin
        first = (first_frame - origin) // hop - 1
        return max(first, 0), min((end_frame - origin - 1) // hop + 1, phases.turn.size)

    def _surrounded(self, phases: "_Phases", first_frame: int, end_frame: int) -> bool:
        first, last = self._range(phases, first_frame, end_frame)
        inside = first_frame >= self.pieces.origin and end_frame <= self.pieces.end
        return inside and first >= NEAR and phases.turn.size - last >= NEAR

    def _step(self, phases: "_Phases", first_frame: int, end_frame: int) -> Break | None:
        """Return the most certain step of phase without one of level."""
        begin, end = self._range(phases, first_frame, end_frame)
        best: tuple[float, int, float] | None = None
        for side in phases.sides:
            steps, scatter, at = _steps(phases.turn, side)
            limit = np.maximum(SURE * scatter * phases.scatter, self._floor(phases, side))
            excess = np.where((at > begin) & (at < end), np.abs(steps) / limit, 0.0)
            if not excess.size:
                break
            top = int(np.argmax(excess))
            if excess[top] > 1.0 and (best is None or excess[top] > best[0]):
                best = float(excess[top]), int(at[top]), float(steps[top])
        if best is None or phases.level_steps(best[1]):
            return None
        blurred = 1 + math.ceil(_BLUR * (phases.scatter / best[2]) ** 2)
        return self._break(max(0, best[1] - blurred), best[1] + blurred, best[2])

    def _floor(self, phases: "_Phases", side: int) -> float:
        if not phases.still:
            return MOVING_TWIST
        return max(LEAST_TURN, 0.5 * self.least_rad if side > NEAR else 0.0)

    def _limit(self, phases: "_Phases", first_frame: int, end_frame: int) -> float:
        """Return the smallest step that would have been found at the worst place of a stretch."""
        begin, end = self._range(phases, first_frame, end_frame)
        reached = np.full(end - begin, np.inf)
        for side in phases.sides:
            _, scatter, at = _steps(phases.turn, side)
            inside = (at >= begin) & (at < end)
            limit = np.maximum(SURE * scatter * phases.scatter, self._floor(phases, side))[inside]
            reached[at[inside] - begin] = np.minimum(reached[at[inside] - begin], limit)
        return float(reached.max(initial=0.0))

    def _strange(self, phases: "_Phases", first_frame: int, end_frame: int, least: float) -> Break | None:
        """Return the pieces whose phase, or with `least` 0 level or rest too, is not that of their neighbours."""
        begin, end = self._range(phases, first_frame, end_frame)
        low, high = max(0, begin - NEAR), end + NEAR  # the others have no say
        turned = np.abs(_off_middle(phases.turn[low:high])) > max(STRANGE * phases.scatter, least)
        share = 1.0 + _off_middle(phases.level[low:high]) / phases.usual
        strange = turned & (share > HURT)
        if not least:
            strange = turned | (np.abs(share - 1.0) > STRANGE * phases.scatter) | phases.loud()[low:high]
        where = np.flatnonzero(strange[begin - low : end - low]) + begin
        return self._break(int(where[0]), int(where[-1]), 0.0) if where.size else None

    def _break(self, first_piece: int, last_piece: int, step_rad: float) -> Break:
        hop = self.pieces.hop
        return Break(self.pieces.origin + first_piece * hop, (last_piece - first_piece + 2) * hop, step_rad)


@attrs.frozen(eq=False)
class _Phases:
    """The strongest channel's phase along the pieces, drift taken out, and what is typical of it."""

    turn: Samples  # rad, unwrapped
    scatter: float  # standard deviation of one piece's phase, rad
    level: Samples  # amplitude of each piece
    usual: float  # the median of it
    rest: Samples  # mean square beside the tone
    still: bool

    @property
    def sides(self) -> tuple[int, ...]:
        """How many pieces to a side are compared: near ones only while the level moves."""
        return _SIDES if self.still else _SIDES[:2]

    def loud(self) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
        """Which pieces hold far more beside the tone than their neighbours do."""
        log = np.log(np.maximum(self.rest, _NOTHING * self.level**2 + 1e-300))
        off = _off_middle(log)
        typical = 1.4826 * float(np.median(np.abs(off)))
        return np.asarray(off > max(STRANGE * typical, 0.7))

    def level_steps(self, piece: int) -> bool:
        """Whether the level changes with the phase: frames that are lost change no level, a switch or a hand does."""
        before = self.level[max(0, piece - 5) : max(0, piece - 1)]
        after = self.level[piece + 2 : piece + 6]
        if not before.size or not after.size:
            return False
        return abs(math.log(float(np.median(after) / np.median(before)))) > max(0.02, STRANGE * self.scatter)


def phases_of(amplitude: Phasors, rest: Samples, least_scatter: float) -> _Phases | None:
    """Return the phases of the strongest channel; None where there are too few pieces or the tone is not clear."""
    if len(amplitude) < 2 * NEAR:
        return None
    channel = int(np.argmax(np.median(np.abs(amplitude), axis=0)))
    tone, beside = amplitude[:, channel], rest[:, channel]
    level = np.abs(tone)
    if not level.all():
        level = np.maximum(level, 1e-12)
    steps = np.angle(tone[1:] * tone[:-1].conj())
    usual = float(np.median(steps))
    steps = np.angle(np.exp(1j * (steps - usual)))
    turn = np.concatenate([[0.0], np.cumsum(steps)])
    scatter = 1.4826 * float(np.median(np.abs(np.diff(steps)))) / math.sqrt(_BENDS)
    middle = float(np.median(level))
    if scatter > 0.1 or middle < 1e-9:
        return None
    scatter = max(scatter, least_scatter)
    near, expected, _ = _steps(turn, NEAR)
    slow = 1.4826 * float(np.median(np.abs(near) / expected)) / scatter
    if slow > COLOURED:  # a second tone, hum: what stays for longer than a piece scatters the steps more
        scatter *= slow
    span = np.quantile(level, [0.05, 0.95])
    return _Phases(
        turn,
        scatter,
        level,
        middle,
        beside,
        bool(math.log(span[1] / span[0]) < STILL + 5 * scatter),
    )


def _off_middle(values: Samples) -> Samples:
    """Return how far each value is from the median of the nearest 17."""
    padded = np.pad(values, NEAR, mode="edge")
    windows = np.lib.stride_tricks.sliding_window_view(padded, 2 * NEAR + 1)
    return np.asarray(values - np.partition(windows, NEAR, axis=1)[:, NEAR])


def _steps(turn: Samples, side: int) -> tuple[Samples, Samples, "np.ndarray[tuple[int], np.dtype[np.intp]]"]:
    """Return step, its standard deviation in that of one piece, and piece, for a step within each piece.

    Least squares of two straight lines of one slope: up to `side` pieces before the place and after it; the two pieces
    that hold the place are left out. At the ends one side may be shorter, down to 3.
    """
    count = turn.size
    at = np.arange(4, count - 3, dtype=np.intp)
    before, after = np.minimum(side, at - 1).astype(float), np.minimum(side, count - 1 - at).astype(float)
    keep = np.maximum(before, after) >= min(side, count // 2 - 1)
    at, before, after = at[keep], before[keep], after[keep]
    sums = np.concatenate([[0.0], np.cumsum(turn)])
    firsts = np.concatenate([[0.0], np.cumsum(turn * np.arange(count))])
    low, high = at - 1 - before.astype(int), at + 1 + after.astype(int)
    mean_a, moment_a, centre_a = _line(sums, firsts, low, at - 1)
    mean_b, moment_b, centre_b = _line(sums, firsts, at + 1, high)
    spread = (before * (before**2 - 1.0) + after * (after**2 - 1.0)) / 12.0
    slope = (moment_a + moment_b) / spread
    way = centre_b - centre_a
    scatter = np.sqrt(1.0 / before + 1.0 / after + way**2 / spread) * _OVERLAP
    return mean_b - mean_a - slope * way, scatter, at


def _line(sums: Samples, firsts: Samples, low: np.ndarray, high: np.ndarray) -> tuple[Samples, Samples, Samples]:
    """Return mean, moment about the centre, and centre of values low…high."""
    count = (high - low).astype(float)
    centre = (low + high - 1) / 2.0
    mean = (sums[high] - sums[low]) / count
    return mean, firsts[high] - firsts[low] - centre * (sums[high] - sums[low]), centre
