"""One stroke of a hand on the control: blocks as dense as it moves, until it passes the last point or rests."""

import math
from collections.abc import Callable

from wattproof.core.notes import Kind, Note, note
from wattproof.core.reading import Reading, State
from wattproof.core.signal import Capture
from wattproof.core.units import db, from_db
from wattproof.dsp.movement import LONGEST_MOVING_S
from wattproof.dsp.power_curve import Dominated, Point, point_of
from wattproof.procedures.driving import Doing, Driving, Muted
from wattproof.procedures.guard import FALL_DB
from wattproof.procedures.power_plan import HandPlan
from wattproof.procedures.requests import Acquire, Kept, Mark, Role, Shown

STEP_DB = 0.15  # how far the level may move from one reading to the next
SHORTEST_STEP_S, LONGEST_STEP_S = 0.005, 0.1
UNREAD_STEP_S = 0.02  # after a block that could not be read: the next one soon
FALL_LASTS_S = 0.3  # a drop-out of a dirty track is over sooner
RECOVERED = 0.5
RESTS_DB = 0.1
DOWN_BY_DB = 32.0  # below the start of a stroke down: the trend of the onset needs 30
SAID_EACH_S = 0.5
_CYCLES = 3.1
_WORDS = {
    Dominated.NOISE: "noise makes up THD+N, which falls as the level rises",
    Dominated.HARMONICS: "harmonics make up THD+N",
    Dominated.BOTH: "noise and harmonics make up THD+N",
}


class Stroke:
    """Follows one stroke. `points` are its readings in the order of time, crackles included."""

    def __init__(self, driving: Driving, plan: HandPlan, number: int, share: Callable[[], float]) -> None:
        self.points: list[Point] = []
        self._driving, self._plan, self._number, self._share = driving, plan, number, share
        self._rate_hz = driving.place.rate_hz
        self._mark = Mark(Role.STROKE, driving.row.index, number, drive_fs=driving.level_fs)
        self._begun_s = driving.clock_s
        self._passed = 0
        self._fall: tuple[float, float] | None = None  # since when, and from which voltage
        self._rest: tuple[float, float] = (driving.clock_s, 0.0)  # since when, and at which voltage
        self._moved = False
        self._highest_vrms = 0.0
        self._said_s = -math.inf

    def followed(self) -> Doing[Note]:
        """Follow the hand, keep each reading, and return why the stroke is over.

        Raises:
            Muted: the guard silenced the tone.
        """
        last: Capture | None = None
        step_s = SHORTEST_STEP_S
        while True:
            frames = self._frames()
            hop = None if last is None else last.frames + min(round(step_s * self._rate_hz), frames) - frames
            if last is not None and hop is not None and hop < 1 - frames:
                hop = 1 - frames
            capture = yield Acquire(frames, hop)
            assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
            fresh_s = capture.span.seconds
            if last is not None:
                fresh_s = max(capture.span.end_frame - last.span.end_frame, 0) / self._rate_hz
            last = capture
            reading = yield from self._read(capture, fresh_s)
            step_s = self._step_s(reading)
            end = yield from self._judged(reading, capture.span.seconds / step_s)
            if end is not None:
                return end

    def _frames(self) -> int:
        least = math.ceil(_CYCLES / self._plan.frequency_hz * self._rate_hz)
        longest = round(LONGEST_MOVING_S * self._rate_hz)  # a hand that stood still may start at any moment
        return max(min(self._driving.reader.next_frames, longest), least)

    def _read(self, capture: Capture, fresh_s: float) -> Doing[Reading]:
        driving = self._driving
        readings, picture = driving.taken(capture)
        reading = readings[driving.row.wiring.input - 1]
        driving.all_inputs = readings
        try:
            yield from driving.guard(reading, fresh_s)
        except Muted:
            yield Kept(reading, self._mark)
            raise
        yield Kept(reading, self._mark)
        yield Shown(readings, picture)
        return reading

    def _step_s(self, reading: Reading) -> float:
        if reading.state is not State.OK:
            return UNREAD_STEP_S
        rate = next((dict(each.values)["db_per_s"] for each in reading.notes if each.kind is Kind.LEVEL_MOVES), 0.0)
        return min(max(STEP_DB / max(abs(float(rate)), 1e-3), SHORTEST_STEP_S), LONGEST_STEP_S)

    def _judged(self, reading: Reading, overlap: float) -> Doing[Note | None]:
        """Take a reading and return why the stroke is over, if it is."""
        driving, now_s = self._driving, self._driving.clock_s
        point = point_of(reading, self._number)
        vrms = 0.0 if point is None else point.voltage_vrms
        fell_db = self._fallen(reading, vrms, now_s)
        if fell_db:
            yield from driving.silence()
            raise Muted(note(Kind.PROTECTION, db=fell_db), final=True)
        if now_s - self._begun_s > self._plan.stroke_s:
            return note(Kind.CONTROL_RESTS, vrms=vrms)
        if point is None:
            return None
        self.points.append(point)
        self._highest_vrms = max(self._highest_vrms, vrms)
        if now_s - self._said_s >= SAID_EACH_S:
            self._said_s = now_s
            left_s = max(self._plan.stroke_s - (now_s - self._begun_s), 0.0)
            words = note(Kind.FOLLOWING, vrms=vrms, what=_WORDS[point.dominated])
            yield driving.progress(self._share(), left_s, words)
        return self._over(point, overlap, now_s)

    def _over(self, point: Point, overlap: float, now_s: float) -> Note | None:
        vrms = point.voltage_vrms
        beyond = point.thdn >= self._plan.stop_thdn and point.dominated is Dominated.HARMONICS
        self._passed = self._passed + 1 if beyond and vrms > 0.9 * self._highest_vrms else 0
        if self._number == 0 and self._passed > 1.0 + overlap:  # a crackle spoils no more blocks than reach over it
            return note(Kind.PASSED, percent=100.0 * self._plan.stop_thdn, vrms=vrms)
        if self._number > 0 and vrms < self._highest_vrms * from_db(-DOWN_BY_DB):
            return note(Kind.CONTROL_RESTS, vrms=vrms)
        since_s, at_vrms = self._rest
        if at_vrms == 0.0 or abs(db(vrms / at_vrms)) > RESTS_DB:
            self._moved = self._moved or at_vrms > 0.0
            self._rest = now_s, vrms
        elif self._moved and now_s - since_s > self._plan.rest_s:
            return note(Kind.CONTROL_RESTS, vrms=vrms)
        return None

    def _fallen(self, reading: Reading, vrms: float, now_s: float) -> float:
        """Return by how many dB the output fell at once and stayed down; 0 while it did not."""
        if reading.state not in {State.OK, State.NO_TONE, State.UNSTEADY}:
            return 0.0
        if self._fall is not None:
            since_s, from_vrms = self._fall
            if vrms > RECOVERED * from_vrms:
                self._fall = None
            elif now_s - since_s > FALL_LASTS_S:
                return min(-db(max(vrms / from_vrms, 1e-5)), 99.0)
            return 0.0
        before = self.points[-1] if self.points else None
        recent = before is not None and reading.span.start_s - before.start_s < FALL_LASTS_S
        if before is not None and recent and vrms < before.voltage_vrms * from_db(-FALL_DB):
            self._fall = now_s, before.voltage_vrms
        return 0.0
