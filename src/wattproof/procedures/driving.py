"""Drives and reads one row under guard: the drive climbs at its rate, limits and heat are followed, falls are seen."""

import math
from collections.abc import Generator
from typing import TypeVar

import attrs

from wattproof.core.errors import WattproofError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, State
from wattproof.core.signal import Capture, Tone
from wattproof.core.units import db, from_db
from wattproof.core.wording import sentence
from wattproof.dsp.power_curve import Dominated, point_of
from wattproof.procedures.absolute import absolute
from wattproof.procedures.guard import PRESENCE_S, PRESENCE_SHARE, Heat, Presence, fell, pause_s
from wattproof.procedures.power_plan import START_DBFS, PowerPlan
from wattproof.procedures.power_rows import Place, Row, ceiling_fs, settings_of, wired_as
from wattproof.procedures.requests import (
    Acquire,
    Action,
    Ask,
    Kept,
    Mark,
    Play,
    Progress,
    Prompt,
    Record,
    Request,
    Shown,
    Wanted,
    Wishes,
)

Answer = int | float | str | Capture | Wishes | None
Result = TypeVar("Result")
Doing = Generator[Request | Record, Answer, Result]

START_FS = from_db(START_DBFS)
BLIND_FS = from_db(-40.0)  # a tone that does not arrive is not raised above this
CLIMB_STEP_DB = 3.0
LOOK_S = 0.1
MARGIN = 1.02  # of the time that a rise takes: blocks are whole frames
BURST_SETTLE_S = 0.05
BURST_READ_S = 0.3
LOAD, ATTENUATOR = "the load", "the attenuator"
HERE = "here"  # what a Prompt to confirm wants: "I am here"
_TRIES = 3
_CYCLES = 4.0  # in the shortest block
_NEAR_ZERO = 1e-9


class Muted(Exception):  # noqa: N818 - it is no error: the tone was silenced for a reason, which the note tells
    """The tone was silenced by the guard; `final` where nothing may sound again in this run."""

    def __init__(self, why: Note, *, final: bool) -> None:
        super().__init__(sentence(why))
        self.why = why
        self.final = final


class Driving:
    """The drive and the readings of one procedure. Each method that yields is a part of the procedure's generator."""

    cycles = _CYCLES

    def __init__(self, plan: PowerPlan, place: Place, row: Row) -> None:
        self.plan, self.place, self.row = plan, place, row
        self.level_fs = 0.0
        self.ceiling_fs = ceiling_fs(plan, place, row.outputs)
        self.clock_s = 0.0
        self.reader = place.new_reader(place.rate_hz, settings_of(plan, place, row))
        self._rig = wired_as(place.rig, row)
        self.heats = _heats(row)
        self.presence = Presence()
        self.last: Reading | None = None
        self.all_inputs: tuple[Reading, ...] = ()
        self._last_level_fs = 0.0
        self._since_play_s = math.inf
        self._burst_fs = 0.0

    def take_row(self, row: Row) -> None:
        """Go on with another row; heat stays where parts stay. To be called in silence."""
        if self.level_fs > 0.0:
            raise ValueError("a row was changed while the tone sounds; silence it first")
        new = _heats(row)
        if row.load == self.row.load:
            new[: len(self.heats)] = self.heats
        self.row, self.heats, self.last, self._burst_fs = row, new, None, 0.0
        self.ceiling_fs = ceiling_fs(self.plan, self.place, row.outputs)
        self.reader = self.place.new_reader(self.place.rate_hz, settings_of(self.plan, self.place, row))
        self._rig = wired_as(self.place.rig, row)

    def silence(self) -> Doing[None]:
        """Ramp down."""
        if self.row.outputs:
            yield Play(Tone(self.plan.frequency_hz, 0.0, self.row.outputs))
        self.level_fs, self.last, self._since_play_s = 0.0, None, 0.0

    def sound(self, level_fs: float) -> Doing[None]:
        """Bring the drive to a level, at once downwards, upwards from −60 dBFS at the stated rate.

        Raises:
            Muted: the guard silenced the tone on the way.
        """
        level_fs = min(level_fs, self.ceiling_fs)
        if not self.row.outputs:  # a recording: its tone was played long ago, and may be of any frequency
            self.reader.restart(None)
            self.level_fs = level_fs
            return
        if self.level_fs == 0.0:
            self.reader.restart(self.plan.frequency_hz)
            yield from self._play(min(level_fs, START_FS))
        while self.level_fs < level_fs * (1.0 - _NEAR_ZERO):
            rise_db = min(CLIMB_STEP_DB, db(level_fs / self.level_fs))
            missing_s = MARGIN * rise_db / self.plan.rise_db_per_s - self._since_play_s
            if missing_s > 0.0:
                yield from self.look(max(missing_s, LOOK_S))
            yield from self._play(min(level_fs, self.level_fs * from_db(rise_db)))
        if self.level_fs > level_fs:
            yield from self._play(level_fs)

    def look(self, seconds: float, settle_s: float = 0.0) -> Doing[Reading]:
        """Read a block under guard; it is shown and not kept.

        Raises:
            Muted: a limit, heat, absence or a sudden fall silenced the tone.
            WattproofError: the interface is overloaded, or no tone arrives.
        """
        return (yield from self._block(seconds, settle_s))

    def read(self, seconds: float, settle_s: float, mark: Mark) -> Doing[Reading]:
        """Read a block under guard and keep it, again where it was not fit to be read.

        Raises:
            Muted: as `look`.
            WattproofError: as `look`, or no block was fit.
        """
        for _ in range(_TRIES):
            reading = yield from self._block(seconds, settle_s)
            if reading.state is State.OK:
                yield Kept(reading, attrs.evolve(mark, drive_fs=self.level_fs, row=self.row.index))
                return reading
            settle_s = 0.0
        yield from self.silence()
        why = "; ".join(sentence(each) for each in reading.notes) or reading.state.value
        raise WattproofError(f"input {self.row.wiring.input}: {why}")

    def read_or_none(self, seconds: float, settle_s: float, mark: Mark) -> Doing[Reading | None]:
        """Read as `read`; None where a tone that is still soft drowns in noise.

        Raises:
            Muted: as `look`.
            WattproofError: as `read`.
        """
        if self.level_fs >= BLIND_FS:
            return (yield from self.read(seconds, settle_s, mark))
        reading = yield from self._block(seconds, settle_s)
        if reading.state is not State.OK:
            return None
        yield Kept(reading, attrs.evolve(mark, drive_fs=self.level_fs, row=self.row.index))
        return reading

    def burst(self, level_fs: float, mark: Mark) -> Doing[Reading]:
        """Read one short burst and be silent long enough after it. From burst to burst the level rises by its rate.

        Raises:
            ValueError: it would rise faster.
            Muted: as `look`.
            WattproofError: as `read`.
        """
        rise_db = db(level_fs / self._burst_fs) if self._burst_fs else db(level_fs / START_FS)
        if rise_db > self.plan.rise_db_per_s * self._since_play_s * (1.0 / MARGIN) and level_fs > START_FS:
            raise ValueError(f"a burst would rise by {rise_db:.1f} dB at once; step up to it")
        if self.level_fs == 0.0:
            self.reader.restart(self.plan.frequency_hz)
        yield from self._play(level_fs)
        self._burst_fs = level_fs
        reading = yield from self.read(BURST_READ_S, BURST_SETTLE_S, mark)
        kept = self.last, self._last_level_fs
        yield from self.silence()
        yield from self.pause(pause_s(BURST_READ_S + BURST_SETTLE_S))
        self.last, self._last_level_fs = kept
        return reading

    def pause(self, seconds: float) -> Doing[None]:
        """Let time pass in silence; parts cool."""
        yield Acquire(max(1, round(seconds * self.place.rate_hz)))
        self._pass(None, seconds)

    def progress(self, share: float, left_s: float, doing: Note) -> Progress:
        """Return the record of how far the procedure is, with the time that the hottest part has left."""
        reading = self.last
        left = None
        if reading is not None and self.level_fs > 0.0:
            left = min((heat.left_s(_spent(heat, reading)) for heat in self.heats), default=math.inf)
        finite = None if left is None or math.isinf(left) else left
        return Progress(min(max(share, 0.0), 1.0), max(left_s, 0.0), doing, finite)

    def heat_allows(self, reading: Reading, seconds: float) -> str:
        """Return the part that would pass its rating within a time at a reading's power; empty where none would."""
        return next((heat.part for heat in self.heats if heat.left_s(_spent(heat, reading)) < seconds), "")

    def guard(self, reading: Reading, seconds: float) -> Doing[None]:
        """Judge a reading that covers `seconds` of new sound: limits, presence, heat.

        Raises:
            Muted: the tone was silenced, and why.
        """
        self._pass(reading, seconds)
        why = self._limit(reading)
        if why is not None:
            yield from self._mute(why, final=False)
        yield from self._stay(reading, seconds)
        hot = next((heat for heat in self.heats if heat.share > 1.0), None)
        if hot is not None:
            yield from self._mute(note(Kind.HEAT_REACHED, what=hot.part), final=True)

    def taken(self, capture: Capture) -> tuple[tuple[Reading, ...], Picture | None]:
        """Read a block in volts and watts at the amplifier's terminals, and draw the row's own channel."""
        readings, picture = self.reader.take(capture, self.row.wiring.input)
        if self.plan.full_scale_vrms is not None:
            return readings, picture
        rig, calibration, level_fs = self._rig, self.place.calibration, self.level_fs or None
        return tuple(absolute(reading, rig, calibration, level_fs) for reading in readings), picture

    def _mute(self, why: Note, *, final: bool) -> Doing[None]:
        yield from self.silence()
        raise Muted(why, final=final)

    def _play(self, level_fs: float) -> Doing[None]:
        if self.row.outputs:
            yield Play(Tone(self.plan.frequency_hz, level_fs, self.row.outputs))
        self.level_fs, self._since_play_s = level_fs, 0.0

    def _block(self, seconds: float, settle_s: float) -> Doing[Reading]:
        frames = round(max(seconds, self.cycles / self.plan.frequency_hz) * self.place.rate_hz)
        capture = yield Acquire(frames, None, settle_s)
        assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
        readings, picture = self.taken(capture)
        reading = readings[self.row.wiring.input - 1]
        self.all_inputs = readings
        yield from self._judge(reading)
        yield from self.guard(reading, settle_s + capture.span.seconds)
        yield Shown(readings, picture)
        return reading

    def _judge(self, reading: Reading) -> Doing[None]:
        """See to an overload, a tone that does not arrive, and a level that fell at once."""
        socket, level_fs = self.row.wiring.input, self.level_fs
        if reading.state is State.OVERLOAD:
            yield from self.silence()
            raise WattproofError(f"input {socket}: {sentence(reading.notes[0])}")
        if reading.state not in {State.OK, State.NO_TONE} or level_fs == 0.0:
            return
        vrms = 0.0 if reading.level_vrms is None or reading.state is State.NO_TONE else reading.level_vrms.value
        before = self.last
        if before is not None and before.level_vrms is not None and level_fs >= BLIND_FS:
            down_db = fell(before.level_vrms.value, level_fs / self._last_level_fs, vrms)
            if down_db > 0.0:
                yield from self._mute(note(Kind.PROTECTION, db=min(down_db, 99.0)), final=True)
        if reading.state is State.OK:
            self.last, self._last_level_fs = reading, level_fs
        elif level_fs >= BLIND_FS * (1.0 - _NEAR_ZERO):
            yield from self.silence()
            raise WattproofError(
                f"input {socket}: no tone arrives at {db(level_fs):.0f} dBFS; check the wiring, the amplifier and its "
                "volume control"
            )

    def _limit(self, reading: Reading) -> Note | None:
        """Return which limit that the person set a reading has reached, or None."""
        plan = self.plan
        watched = (
            ("output", "V rms", reading.level_vrms, plan.limit_vrms),
            ("power", "W", reading.power_w, plan.limit_w),
            ("THD+N", "(plain ratio)", reading.thdn if self._above_noise(reading) else None, plan.limit_thdn),
        )
        for what, unit, quantity, limit in watched:
            if quantity is not None and limit is not None and quantity.value >= limit:
                return note(Kind.LIMIT_REACHED, what=what, limit=limit, named=unit)
        over_s = max((heat.over_s for heat in self.heats if heat.part == LOAD), default=0.0)
        if plan.limit_over_s is not None and over_s > plan.limit_over_s:
            return note(Kind.LIMIT_REACHED, what="time above the load's rating", limit=plan.limit_over_s, named="s")
        return None

    def _above_noise(self, reading: Reading) -> bool:
        """Whether THD+N is made of harmonics: at a low level noise alone may stand above any limit."""
        point = point_of(reading)
        return point is not None and point.dominated is Dominated.HARMONICS

    def _stay(self, reading: Reading, seconds: float) -> Doing[None]:
        """Ask for "I am here" in time while parts are warm; mute where nobody says so."""
        warm = any(_spent(heat, reading) > PRESENCE_SHARE * heat.rated_w for heat in self.heats)
        if not warm or self.level_fs == 0.0:
            self.presence.pass_time(seconds, warm=False, said=self.presence.said)
            return
        wishes = yield Wanted()
        assert isinstance(wishes, Wishes)  # noqa: S101 - the answer that a Wanted has by contract
        self.presence.pass_time(seconds, warm=True, said=wishes.here)
        if self.presence.due:
            self.presence.asked = True
            yield Prompt(Ask(Action.CONFIRM, HERE))
        if self.presence.missed:
            yield from self._mute(note(Kind.NOBODY_HERE, seconds=PRESENCE_S), final=True)

    def _pass(self, reading: Reading | None, seconds: float) -> None:
        self.clock_s += seconds
        self._since_play_s += seconds
        for heat in self.heats:
            heat.spend(0.0 if reading is None else _spent(heat, reading), seconds)


def _heats(row: Row) -> list[Heat]:
    """Return the parts whose rating is known. A voltage rating counts as its square: heat goes with it."""
    heats = []
    if row.load.rated_w is not None:
        heats.append(Heat(LOAD, row.load.rated_w))
    rated_vrms = row.wiring.attenuator.rated_vrms
    if rated_vrms is not None:
        heats.append(Heat(ATTENUATOR, rated_vrms**2))
    return heats


def _spent(heat: Heat, reading: Reading) -> float:
    """Return what a part takes at a reading, in the unit of its rating."""
    if heat.part == LOAD:
        return 0.0 if reading.power_w is None else reading.power_w.value
    return 0.0 if reading.level_vrms is None else reading.level_vrms.value**2
