"""Going from row to row: what a person is asked, always in silence, and what can be checked of the answer."""

import math

from wattproof.core.errors import StoppedError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import STATISTICS, Quantity
from wattproof.core.reading import Reading
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.procedures.driving import Doing, Driving
from wattproof.procedures.guard import BURST_DUTY, BURST_S, parts_burnt
from wattproof.procedures.power_rows import Row
from wattproof.procedures.requests import Action, Ask, Mark, Role, Said

YES = "yes"
FULL, DOWN, UP, BACK, LEAVE = "full", "down", "up", "back", "leave"  # what a TURN wants of the volume control
CHECK_S = 1.0
CHECK_SETTLE_S = 0.3
RECOGNISED_DB = 10.0  # crosstalk of any amplifier that works is further down
SILENT = 1e-3  # 60 dB down: further than that is not told apart from silence
RECOGNISED_TIMES = 5.0  # times its uncertainty
REPEATS_DB = 0.003  # a level at the same drive, read again after a switch: our own allowance for contacts and warmth


def begin(driving: Driving, turn: str) -> Doing[None]:
    """Have load and limits confirmed and the control set, before anything sounds.

    Raises:
        StoppedError: they were not confirmed.
    """
    row = driving.row
    answer = yield Ask(Action.CONFIRM, f"{row.load.nominal_ohm:g}", "load and limits")
    if answer != YES:
        raise StoppedError("load and limits were not confirmed: nothing sounded")
    yield Ask(Action.TURN, turn)
    words = "the person's word, confirmed at the start" if driving.place.real else "what the bench itself declares"
    yield Said(note(Kind.LOAD_ASSUMED, load_ohm=row.load.ohm, what=words), row.index)
    for what in _unrated(row):
        yield Said(note(Kind.NO_RATING, what=what), row.index)
    if driving.plan.full_scale_vrms is not None:
        yield Said(note(Kind.TYPED_SCALE), row.index)
    if driving.plan.in_bursts:
        hz = driving.plan.frequency_hz
        burnt = parts_burnt(hz)
        yield Said(
            note(Kind.BURSTS, burst_s=BURST_S, percent=100.0 * BURST_DUTY, frequency_hz=hz, what=burnt), row.index
        )


def switch(driving: Driving, row: Row, load_in_ohm: float) -> Doing[None]:
    """Fall silent, have the load and the channel switched where they differ, and go on with the row."""
    before = driving.row
    yield from driving.silence()
    if row.load.nominal_ohm != load_in_ohm:
        yield Ask(Action.SWITCH_LOAD, row.load.nominal_ohm, "in silence")
    if row.channel != before.channel and row.wiring == before.wiring:
        yield Ask(Action.SWITCH_CHANNEL, float(row.channel), "in silence")
    driving.take_row(row)


def check_level(driving: Driving, drive_fs: float) -> Doing[Reading]:
    """Read the level at a drive far below clipping, to compare it after a switch."""
    yield from driving.sound(drive_fs)
    return (yield from driving.read(CHECK_S, CHECK_SETTLE_S, Mark(Role.CHECK)))


def judged_load(before: Reading, after: Reading) -> Note:
    """Return what two levels at one drive, before and after a switch of the load, say of it."""
    first, second = before.level_vrms, after.level_vrms
    before_ohm, after_ohm = before.settings.load_ohm or 0.0, after.settings.load_ohm or 0.0
    if first is None or second is None:
        return note(Kind.LOAD_STATED, after_ohm=after_ohm, db=0.0)
    change_db = db(second.value / first.value)
    u_db = math.hypot(_scatter_db(first), _scatter_db(second), REPEATS_DB)
    if abs(change_db) <= RECOGNISED_TIMES * u_db:
        return note(Kind.LOAD_STATED, after_ohm=after_ohm, db=change_db)
    if (change_db > 0.0) != (after_ohm > before_ohm):
        return note(Kind.LOAD_WRONG_WAY, before_ohm=before_ohm, after_ohm=after_ohm, db=change_db)
    return note(Kind.LOAD_SEEN, before_ohm=before_ohm, after_ohm=after_ohm, db=change_db)


def judged_channel(row: Row, readings: tuple[Reading, ...]) -> Note:
    """Return whether a tone that sounds on one channel arrives on its input, from the readings of all inputs."""
    own = next((reading for reading in readings if reading.channel == row.wiring.input), None)
    others = [reading for reading in readings if reading is not own]
    if own is None or not others or len(row.driven) > 1 or _size(own) == 0.0:
        return note(Kind.CHANNEL_STATED, channel=row.channel)
    loudest = max(others, key=_size)
    apart_db = db(_size(own) / max(_size(loudest), _size(own) * SILENT))
    if apart_db >= RECOGNISED_DB:
        return note(Kind.CHANNEL_SEEN, channel=row.channel, db=apart_db)
    if apart_db <= -RECOGNISED_DB:
        return note(Kind.CHANNEL_ELSEWHERE, channel=row.channel, input=loudest.channel)
    return note(Kind.CHANNEL_STATED, channel=row.channel)


def _size(reading: Reading) -> float:
    level = reading.fundamental_fs or reading.level_fs
    return 0.0 if level is None else level.value


def _scatter_db(level: Quantity) -> float:
    u = math.hypot(*(part.u for part in level.parts if part.source == STATISTICS))
    return DB_PER_RELATIVE * u / level.value


def _unrated(row: Row) -> tuple[str, ...]:
    known = (("the load", row.load.rated_w), ("the attenuator", row.wiring.attenuator.rated_vrms))
    return tuple(what for what, rating in known if rating is None)
