"""What the records of a session file hold, as values: a run, a reading with its place, a stretch of samples."""

from collections.abc import Mapping
from enum import StrEnum
from typing import Any

import attrs

from wattproof.core import checks
from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.core.signal import Gap, Overload
from wattproof.procedures.again import PLANS
from wattproof.procedures.power_plan import PowerPlan
from wattproof.procedures.power_rows import Row
from wattproof.procedures.requests import Kept
from wattproof.store.values import structured


class Kind(StrEnum):
    """What a record is. The values are stored."""

    SESSION = "session"
    DEVICE = "device"
    PHOTO = "photo"
    NOTE = "note"
    CALIBRATION = "calibration"
    RUN = "run"
    CAPTURE = "capture"
    READING = "reading"
    FINDING = "finding"
    ENDING = "ending"
    RELEASED = "released"


class Keeping(StrEnum):
    """Which raw captures of a run stay in the file once it has ended. The values are stored."""

    ALL = "all"
    POINTS = "points"  # of each held or stated point and its neighbours on the curve


@attrs.frozen
class BenchFacts:
    """What a run was measured with, as the bench says; `seeds` are those of what is random in a simulated one."""

    name: str
    rate_hz: float
    inputs: int
    outputs: int
    real: bool
    seeds: Mapping[str, int] = attrs.field(factory=dict)


@attrs.frozen(kw_only=True, eq=False)
class RunFacts:
    """How a run was begun. `settings` are its procedure's; `calibration` is the seq of the record that holds it."""

    procedure: str
    settings: Mapping[str, Any]
    rows: tuple[Row, ...] = ()
    rig: Rig
    calibration: int
    bench: BenchFacts
    versions: Mapping[str, str] = attrs.field(factory=dict)
    keeping: Keeping = Keeping.ALL


def plan_of(facts: RunFacts) -> PowerPlan:
    """Return the plan that a run followed.

    Raises:
        WrongUseError: its procedure is not known here.
    """
    if facts.procedure not in PLANS:
        raise WrongUseError(f"the procedure {facts.procedure!a} is not known to this program; update wattproof")
    return structured(dict(facts.settings), PLANS[facts.procedure])


@attrs.frozen
class Stretch:
    """Frames of one run, counted absolutely."""

    first_frame: int
    frames: int = attrs.field(validator=checks.not_negative)

    @property
    def end_frame(self) -> int:
        """The frame after the last."""
        return self.first_frame + self.frames

    def overlaps(self, other: "Stretch") -> bool:
        """Whether both have a frame in common."""
        return self.first_frame < other.end_frame and other.first_frame < self.end_frame


@attrs.frozen(eq=False)
class StoredReading:
    """A reading, the block that it was read from, and the raw capture around that: half a second of lead-in and it."""

    kept: Kept
    block: Stretch
    raw: Stretch
    gaps: tuple[Gap, ...] = ()
    overloads: tuple[Overload, ...] = ()


@attrs.frozen
class StoredSamples:
    """A stretch of raw samples; `sha256` is that of the coded bytes, which stand in the table `content`."""

    first_frame: int
    frames: int
    channels: int
    rate_hz: float
    coding: str
    sha256: str
    bytes: int

    @property
    def stretch(self) -> Stretch:
        """Which frames they are."""
        return Stretch(self.first_frame, self.frames)


@attrs.frozen
class RunEnding:
    """How a run ended, and how many readings it kept."""

    ending: Ending
    why: str
    readings: int
