"""Power by hand: the trail of a hand on the amplifier's own control is followed, and each point held afterwards."""

import attrs

from wattproof.core.errors import StoppedError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.units import from_db
from wattproof.core.wording import sentence
from wattproof.dsp.onset import NoOnset, Onset, find_onset
from wattproof.dsp.power_curve import Point, crossing_of, curve_of, left_out
from wattproof.procedures.driving import Doing, Driving, Muted
from wattproof.procedures.power_hold import Held, hold
from wattproof.procedures.power_plan import HandPlan
from wattproof.procedures.power_rows import Place, rows_of
from wattproof.procedures.power_search import Search
from wattproof.procedures.power_stroke import Stroke
from wattproof.procedures.power_switching import BACK, DOWN, LEAVE, UP, begin, judged_channel, switch
from wattproof.procedures.requests import Action, Ask, Procedure, Prompt, Said

LOOK_BELOW = from_db(-26.0)  # of the stroke's drive: there the control's new place is read, far from clipping
SCAN_BELOW = from_db(-1.5)  # of the drive that the lowest point needs: where the scan of the held drive begins
SCAN_STEP = from_db(0.4)
SCAN_S, SCAN_SETTLE_S = 0.15, 0.15
MOST_SCANNED = 24


def power_by_hand(plan: HandPlan, place: Place) -> Procedure:
    """Follow strokes of the control, hold each point by lowering the drive, and go on to the next load and channel.

    Raises:
        WrongUseError: no volts are known.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan, place)
    driving = Driving(plan, place, rows[0])
    yield from begin(driving, DOWN)
    load_in_ohm = place.rig.wirings[0].load.nominal_ohm
    for row in rows:
        yield from switch(driving, row, load_in_ohm)
        if row.index:
            yield Ask(Action.TURN, DOWN)
        if row.load.nominal_ohm != load_in_ohm:
            yield Said(note(Kind.LOAD_ASSUMED, load_ohm=row.load.nominal_ohm, what="the person's word"), row.index)
        load_in_ohm = row.load.nominal_ohm
        try:
            yield from _HandRun(driving, plan, len(rows)).measured()
        except Muted as muted:
            yield Said(muted.why, row.index)
            if muted.final:
                raise StoppedError(sentence(muted.why)) from muted
        yield from driving.silence()


@attrs.frozen(eq=False)
class _HandRun:
    driving: Driving
    plan: HandPlan
    rows: int

    def measured(self) -> Doing[None]:
        """Up, held, and down again."""
        driving = self.driving
        yield from driving.sound(driving.ceiling_fs)
        yield Prompt(Ask(Action.TURN, UP))
        up = Stroke(driving, self.plan, 0, share=self._share)
        yield from self._stroke(up)
        yield Said(judged_channel(driving.row, driving.all_inputs), driving.row.index)
        if not up.points or not driving.row.outputs:
            return
        if self.plan.hold_s == 0.0 and self.plan.strokes == 1:
            return
        top_fs = yield from self._held(up.points)
        if self.plan.strokes > 1:
            yield from driving.sound(top_fs)
            yield Prompt(Ask(Action.TURN, BACK))
            yield from self._stroke(Stroke(driving, self.plan, 1, share=self._share))

    def _stroke(self, stroke: Stroke) -> Doing[None]:
        try:
            end: Note = yield from stroke.followed()
        except Muted as muted:
            if muted.final:
                raise
            end = muted.why
        yield from self.driving.silence()
        yield Prompt(Ask(Action.TURN, LEAVE))
        yield Said(end, self.driving.row.index)

    def _held(self, points: list[Point]) -> Doing[float]:
        """Hold the points that the stroke crossed, and return the drive at which the last one is passed again."""
        driving, plan = self.driving, self.plan
        out = left_out(points)
        clean = [point for index, point in enumerate(points) if index not in out]
        onset = find_onset(curve_of(clean))
        volts = self._sought(clean, onset)
        if not volts:
            return driving.ceiling_fs
        search, top_fs = yield from self._scanned(min(volts))
        if plan.hold_s == 0.0 or plan.in_bursts:
            return top_fs
        yield Said(note(Kind.KNOB_HELD), driving.row.index)
        for target in plan.targets:
            thdn = onset.thdn if target.thdn is None and isinstance(onset, Onset) else target.thdn
            if thdn is not None:
                yield from hold(driving, search, Held(target.name, thdn), self._share())
        return top_fs

    def _sought(self, clean: list[Point], onset: Onset | NoOnset) -> list[float]:
        """Return the voltages of the points that the stroke crossed."""
        crossings = [crossing_of(clean, target.thdn) for target in self.plan.targets if target.thdn is not None]
        volts = [crossing.voltage_vrms for crossing in crossings if crossing is not None]
        return [*volts, onset.voltage_vrms] if isinstance(onset, Onset) else volts

    def _scanned(self, lowest_vrms: float) -> Doing[tuple[Search, float]]:
        """Raise the drive past the points, the control left where it is; return what was read and the last drive."""
        driving, search = self.driving, Search()
        level_fs = LOOK_BELOW * driving.ceiling_fs
        yield from driving.sound(level_fs)
        reading = yield from driving.look(SCAN_S, SCAN_SETTLE_S)
        if search.add(level_fs, reading) is not None:
            level_fs *= SCAN_BELOW * lowest_vrms / search.top[1].voltage_vrms
        for _ in range(MOST_SCANNED):
            level_fs = min(level_fs, driving.ceiling_fs)
            yield from driving.sound(level_fs)
            reading = yield from driving.look(SCAN_S, SCAN_SETTLE_S)
            point = search.add(level_fs, reading)
            if (point is not None and point.thdn >= self.plan.stop_thdn) or level_fs >= driving.ceiling_fs:
                break
            level_fs *= SCAN_STEP
        return search, level_fs

    def _share(self) -> float:
        whole_s = 40.0 * self.plan.strokes + len(self.plan.targets) * (self.plan.hold_s + 4.0)
        return min(self.driving.clock_s / (whole_s * self.rows), 0.99)
