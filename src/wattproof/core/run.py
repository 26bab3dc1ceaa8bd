"""One procedure's run, and the session of runs on one device under test."""

from collections.abc import Mapping
from enum import StrEnum
from types import MappingProxyType

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.reading import Reading
from wattproof.core.rig import Rig


def _read_only(given: Mapping[str, object]) -> Mapping[str, object]:
    return MappingProxyType(dict(given))


class Ending(StrEnum):
    """How a run ended."""

    DONE = "done"
    STOPPED = "stopped"
    FAILED = "failed"


@attrs.frozen(kw_only=True, eq=False)
class Run:
    """What one procedure did: settings, rig, calibration, readings in order, and its ending with the reason."""

    procedure: str
    settings: Mapping[str, object] = attrs.field(factory=dict, converter=_read_only)
    rig: Rig
    calibration: Calibration = attrs.field(factory=Calibration)
    readings: tuple[Reading, ...] = ()
    ending: Ending | None = None  # None while it runs
    why: str = ""

    def __attrs_post_init__(self) -> None:
        if self.ending is Ending.FAILED and not self.why:
            raise ValueError("Run.why is empty; a failed run says why")


@attrs.frozen(kw_only=True, eq=False)
class Session:
    """The runs of one device under test, in order."""

    device_under_test: str
    runs: tuple[Run, ...] = ()
    notes: tuple[str, ...] = ()
