"""Power by steps: the drive rises coarse then fine; each point is read and held, for each load and channel."""

import math

import attrs

from wattproof.core.errors import StoppedError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.units import db, from_db
from wattproof.core.wording import sentence
from wattproof.dsp.onset import NoOnset, step_db
from wattproof.dsp.power_curve import Dominated, Point
from wattproof.procedures.driving import START_FS, Doing, Driving, Muted
from wattproof.procedures.power_hold import Held, hold
from wattproof.procedures.power_plan import StepsPlan, Target
from wattproof.procedures.power_rows import Place, rows_of
from wattproof.procedures.power_search import Search
from wattproof.procedures.power_switching import FULL, begin, check_level, judged_channel, judged_load, switch
from wattproof.procedures.requests import Mark, Procedure, Progress, Role, Said

COARSE_READ_S = 0.25
RISING_STEP_DB = 0.5
LIMITED_STEP_DB = 0.25  # of the second way up, after a coarse step met a limit
FINE_READINGS = 8
ONSET_READINGS = 7
ONSET_READ_S = 0.5
MET = 0.004  # relative miss of THD+N from which a reading stands at the point
ONSET_STEP_DB = 0.02
LOWEST_FS = from_db(-84.0)  # how far below the start a record may be carried, where the onset lies low
CHECK_BELOW = from_db(-20.0)  # of the highest drive that was read: there the load is compared
_BELOW_LIMIT = 0.998
_SMALLEST_STEP = 1.004


def power(plan: StepsPlan, place: Place) -> Procedure:
    """Raise the drive, find each point, hold it, and go on to the next load and channel.

    Raises:
        WrongUseError: no volts are known.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan, place)
    driving = Driving(plan, place, rows[0])
    yield from begin(driving, FULL)
    load_in_ohm = place.rig.wirings[0].load.nominal_ohm
    compared = None
    for row in rows:
        yield from switch(driving, row, load_in_ohm)
        run = _RowRun(driving, plan, Search(), len(rows))
        try:
            if compared is not None and row.load.nominal_ohm != load_in_ohm:
                after = yield from check_level(driving, compared[0])
                yield Said(judged_load(compared[1], after), row.index)
            load_in_ohm = row.load.nominal_ohm
            yield from run.measured()
            if len(rows) > 1:
                drive_fs = CHECK_BELOW * run.search.top[0]
                reading = yield from check_level(driving, drive_fs)
                compared = drive_fs, reading
        except Muted as muted:
            yield Said(muted.why, row.index)
            if muted.final:
                raise StoppedError(sentence(muted.why)) from muted
        yield from driving.silence()


@attrs.frozen(eq=False)
class _RowRun:
    """The search of one row."""

    driving: Driving
    plan: StepsPlan
    search: Search
    rows: int

    def measured(self) -> Doing[None]:
        limited = yield from self._up_to_a_limit(START_FS, RISING_STEP_DB if self.plan.in_bursts else self.plan.step_db)
        if limited and self.search.points:  # it may have been far beyond the limit: up again from below, by small steps
            yield from self._up_to_a_limit(self.search.top[0], LIMITED_STEP_DB)
        yield Said(judged_channel(self.driving.row, self.driving.all_inputs), self.driving.row.index)
        if not self.search.points:
            return
        for target in reversed(self.plan.targets):
            if target.thdn is not None:
                yield from self._refined(target, target.thdn)
        if self.plan.onset_thdn is None:
            yield from self._onset_refined()
        if self.plan.hold_s > 0.0 and not self.plan.in_bursts:
            for target in self.plan.targets:
                yield from self._held(target)

    def _up_to_a_limit(self, from_fs: float, by_db: float) -> Doing[bool]:
        """Go up, and return whether the guard muted at a limit; the points below it are still looked at and held."""
        try:
            yield from self._coarse(from_fs, by_db)
        except Muted as muted:
            if muted.final:
                raise
            yield Said(muted.why, self.driving.row.index)
            return True
        return False

    def _coarse(self, from_fs: float, by_db: float) -> Doing[None]:
        """Go up by steps until the last point is passed or a limit is met, and say which."""
        level_fs = min(from_fs, self.driving.ceiling_fs)
        while True:
            yield self._progress(note(Kind.RAISING, db=db(level_fs)))
            point = yield from self._read(level_fs, COARSE_READ_S)
            end = None if point is None else self._end(level_fs, point)
            if end is not None:
                yield Said(end, self.driving.row.index)
                return
            level_fs = self._next(level_fs, point, by_db)

    def _end(self, level_fs: float, point: Point) -> Note | None:
        stop = self.plan.stop_thdn
        if point.thdn >= stop and point.dominated is Dominated.HARMONICS:
            return note(Kind.PASSED, percent=100.0 * stop, vrms=point.voltage_vrms)
        if level_fs >= self.driving.ceiling_fs / _SMALLEST_STEP:
            return note(Kind.DRIVE_LIMIT_REACHED, db=db(self.driving.ceiling_fs))
        if self._most(level_fs, point) <= level_fs * _SMALLEST_STEP:
            plan = self.plan
            if plan.limit_vrms is not None and point.voltage_vrms * _SMALLEST_STEP**2 >= plan.limit_vrms:
                return note(Kind.LIMIT_REACHED, what="output", limit=plan.limit_vrms, named="V rms")
            return note(Kind.LIMIT_REACHED, what="power", limit=plan.limit_w or 0.0, named="W")
        return None

    def _most(self, level_fs: float, point: Point) -> float:
        """Return the highest drive that stays below the limits of voltage and power, as the last reading has it."""
        plan, most = self.plan, self.driving.ceiling_fs
        volts = [plan.limit_vrms] if plan.limit_vrms is not None else []
        if plan.limit_w is not None:
            volts.append(math.sqrt(plan.limit_w * self.driving.row.load.ohm))
        return min([most, *(level_fs * _BELOW_LIMIT * limit / point.voltage_vrms for limit in volts)])

    def _next(self, level_fs: float, point: Point | None, by_db: float) -> float:
        wanted = level_fs * from_db(min(RISING_STEP_DB, by_db) if self.search.rising() else by_db)
        return min(wanted, self.driving.ceiling_fs if point is None else self._most(level_fs, point))

    def _read(self, level_fs: float, seconds: float) -> Doing[Point | None]:
        mark = Mark(Role.STEP)
        if self.plan.in_bursts:
            burst = yield from self.driving.burst(level_fs, mark)
            return self.search.add(level_fs, burst)
        yield from self.driving.sound(level_fs)
        reading = yield from self.driving.read_or_none(seconds, self.plan.settle_s, mark)
        return None if reading is None else self.search.add(level_fs, reading)

    def _refined(self, target: Target, thdn: float) -> Doing[None]:
        """Read nearer and nearer to a THD+N until a reading stands at it."""
        for _ in range(FINE_READINGS):
            drive_fs = self.search.drive_near(thdn)
            if drive_fs is None:
                return
            yield self._progress(note(Kind.LOOKING_CLOSER, named=target.name))
            point = yield from self._read(drive_fs, self.plan.read_s)
            if point is None or abs(math.log(point.thdn / thdn)) < MET:
                return

    def _onset_refined(self) -> Doing[None]:
        """Read between the two readings around the onset until they are near; carry the record down if it must be."""
        for _ in range(ONSET_READINGS):
            onset = self.search.onset()
            if onset is NoOnset.BEGIN_LOWER and self.search.lowest_fs > LOWEST_FS:
                yield from self._carried_down()
                onset = self.search.onset()
            if isinstance(onset, NoOnset) or step_db(onset) < ONSET_STEP_DB:
                return
            yield self._progress(note(Kind.LOOKING_CLOSER, named="onset"))
            middle_vrms = math.sqrt(onset.below_vrms * onset.above_vrms)
            yield from self._read(self.search.drive_at_voltage(middle_vrms), min(ONSET_READ_S, self.plan.read_s))

    def _carried_down(self) -> Doing[None]:
        level_fs = self.search.lowest_fs
        while level_fs > LOWEST_FS:
            level_fs /= from_db(self.plan.step_db)
            yield from self._read(level_fs, COARSE_READ_S)

    def _held(self, target: Target) -> Doing[None]:
        thdn = target.thdn
        if thdn is None:
            onset = self.search.onset()
            if isinstance(onset, NoOnset):
                return
            thdn = onset.thdn
        yield from hold(self.driving, self.search, Held(target.name, thdn), self._share())

    def _whole_s(self) -> float:
        """How long a row takes, about: from what it took so far on the simulated bench."""
        plan = self.plan
        step_db = RISING_STEP_DB if plan.in_bursts else plan.step_db
        steps = db(self.driving.ceiling_fs / START_FS) / step_db + 6.0
        pause = 2.0 if plan.in_bursts else 0.0
        fine = (4.0 * len(plan.targets) + ONSET_READINGS) * (plan.settle_s + plan.read_s + pause)
        holds = 0.0 if plan.in_bursts or plan.hold_s == 0.0 else len(plan.targets) * (plan.hold_s + 3.0)
        return steps * (plan.settle_s + COARSE_READ_S + pause) + fine + holds

    def _share(self) -> float:
        return min(self.driving.clock_s / (self.rows * self._whole_s()), 0.99)

    def _progress(self, doing: Note) -> Progress:
        whole = self.rows * self._whole_s()
        return self.driving.progress(self._share(), max(whole - self.driving.clock_s, 1.0), doing)
