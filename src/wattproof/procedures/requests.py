"""What a procedure asks for and tells: requests that a runner answers, and records that it shows and stores."""

from collections.abc import Generator
from enum import StrEnum

import attrs

from wattproof.core import checks
from wattproof.core.notes import Note
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading
from wattproof.core.signal import Capture, Tone


@attrs.frozen
class Play:
    """Sound a tone. Answer: the absolute frame (int) from which it stands in the capture."""

    tone: Tone


@attrs.frozen
class Acquire:
    """Capture a block. Answer: a Capture of `frames` frames.

    Blocks follow without a hole: each starts `hop` frames after the last one (None: where the last one ended). The
    first block after a Play starts `settle_s` after the tone stands. `renew` starts from the newest frames instead.
    """

    frames: int = attrs.field(validator=checks.positive)
    hop: int | None = None
    settle_s: float = attrs.field(default=0.0, validator=checks.not_negative)
    renew: bool = False


class Action(StrEnum):
    """What a person, or a bench that can do it, is asked to do."""

    TURN = "turn"
    CONNECT = "connect"
    SWITCH_LOAD = "switch_load"
    SWITCH_CHANNEL = "switch_channel"
    CONFIRM = "confirm"


@attrs.frozen
class Ask:
    """Have something done. Answer: what was done (a float or a str). The wording is made at the rim."""

    action: Action
    want: float | str
    check: str = ""


@attrs.frozen
class Wanted:
    """Ask what the person has changed meanwhile. Answer: a Wishes."""


@attrs.frozen
class Wishes:
    """What the person wants of a running watch: tone on or off, its frequency, its level, the channel looked at."""

    tone_on: bool
    frequency_hz: float = attrs.field(validator=checks.positive)
    level_fs: float = attrs.field(validator=checks.within(0.0, 1.0))
    channel: int = attrs.field(default=1, validator=checks.counted_from_one)
    here: int = 0  # how often "I am here" was said, since the runner was made


@attrs.frozen(eq=False)
class Shown:
    """A record for the screen only: the readings of one block, one per channel, and the picture of one of them."""

    readings: tuple[Reading, ...]
    picture: Picture | None = None


class Role(StrEnum):
    """What a kept reading is for. The values are stable: they are stored."""

    STEP = "step"
    STROKE = "stroke"
    HELD = "held"
    CHECK = "check"


@attrs.frozen
class Mark:
    """What the procedure knows of a kept reading: its row of the statement, its stroke, the point it holds, the drive.

    `at` is the point's name (`held` readings only), `held_s` how long it was held when the reading ended. `left_out`
    says why a reading is no part of the curve; empty where it is one.
    """

    role: Role
    row: int = 0
    stroke: int = 0
    at: str = ""
    held_s: float = 0.0
    drive_fs: float = 0.0
    left_out: str = ""


@attrs.frozen
class Figure:
    """One number that a procedure read of a block beside the reading, in the unit that its name tells.

    `at_hz` is the frequency that it belongs to; 0 where it belongs to the whole block. `u` is its standard uncertainty.
    """

    name: str
    value: float
    u: float = 0.0
    at_hz: float = 0.0


@attrs.frozen(eq=False)
class Kept:
    """A record to be stored with its raw capture: one reading of a run, what it was for, and further figures of it."""

    reading: Reading
    mark: Mark | None = None
    figures: tuple[Figure, ...] = ()


@attrs.frozen
class Said:
    """A record to be stored: something that the procedure found out, as a note, for one row of the statement."""

    note: Note
    row: int = 0


@attrs.frozen
class Prompt:
    """A record for the screen only: what the person may do while the tone sounds. Nobody waits for an answer."""

    ask: Ask


@attrs.frozen
class Progress:
    """A record for the screen only: how far a procedure is (0 to 1), how long it will take, and what it does now."""

    share: float = attrs.field(validator=checks.within(0.0, 1.0))
    left_s: float = attrs.field(validator=checks.not_negative)
    doing: Note
    heat_left_s: float | None = None  # until the hottest part reaches its rating at this power; None: it never does


Request = Play | Acquire | Ask | Wanted
Record = Shown | Kept | Said | Prompt | Progress
Procedure = Generator[Request | Record, int | float | str | Capture | Wishes | None, None]
