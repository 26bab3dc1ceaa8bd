"""What a report is made from: a session's device, runs, statements and pictures, as values."""

from collections.abc import Mapping

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.device import DeviceUnderTest
from wattproof.core.picture import Picture
from wattproof.core.rig import Rig
from wattproof.core.run import Ending
from wattproof.core.signal import Samples
from wattproof.procedures.statement import PowerStatement


@attrs.frozen(eq=False)
class OwnFloor:
    """The interface's own noise in a spectrum's unit; `white` where only its sum in the band is known."""

    frequency_hz: Samples
    ratio: Samples
    white: bool


@attrs.frozen(eq=False)
class PointPicture:
    """The picture of one point of a row: of its last held reading, or of the nearest on the curve."""

    row: int
    at: str
    held: bool
    picture: Picture
    floor: OwnFloor | None


@attrs.frozen(kw_only=True, eq=False)
class RunContent:
    """One run: when, with what, how it ended, its statement and its pictures."""

    number: int
    at: str
    procedure: str
    bench: str
    real: bool
    rate_hz: float
    seeds: Mapping[str, int]
    rig: Rig
    calibration: Calibration
    ending: Ending | None
    why: str
    readings: int
    statement: PowerStatement
    pictures: tuple[PointPicture, ...]
    versions: Mapping[str, str]


@attrs.frozen(kw_only=True, eq=False)
class SessionContent:
    """A whole session; `head` is the hash of its last record, `photo` the bytes of a PNG or JPEG."""

    file: str
    device: DeviceUnderTest
    begun_at: str
    notes: tuple[str, ...]
    runs: tuple[RunContent, ...]
    head: str
    photo: bytes | None = None
