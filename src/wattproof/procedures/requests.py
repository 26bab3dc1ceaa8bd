"""What a procedure asks for and tells: requests that a runner answers, and records that it shows and stores."""

from collections.abc import Generator
from enum import StrEnum

import attrs

from wattproof.core import checks
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


@attrs.frozen(eq=False)
class Shown:
    """A record for the screen only: the readings of one block, one per channel, and the picture of one of them."""

    readings: tuple[Reading, ...]
    picture: Picture | None = None


@attrs.frozen(eq=False)
class Kept:
    """A record to be stored with its raw capture: one reading of a run."""

    reading: Reading


Request = Play | Acquire | Ask | Wanted
Record = Shown | Kept
Procedure = Generator[Request | Record, int | float | str | Capture | Wishes | None, None]
