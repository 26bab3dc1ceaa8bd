"""The trail of THD+N that the hand draws: strokes of points from readings, bounded in memory. Pure."""

import math
from enum import StrEnum

import attrs

from wattproof.core.reading import Reading, State

_MOST_POINTS = 4000  # a stroke that grows beyond this drops every second point
OPEN_OHM = 1e5  # from here on nothing is connected that takes power: no dummy load is that high
_NEAR_X = 0.005  # relative change below which a point adds nothing to see (2 pixels of 800 over four decades)
_NEAR_Y = 0.05  # the scatter of a short block, so that a hand at rest draws no blot


class Axis(StrEnum):
    """What the trail is drawn against: power where the load is known, else voltage, else the captured level."""

    POWER = "power"
    VOLTS = "volts"
    FULL_SCALE = "full scale"


@attrs.frozen
class Key:
    """What a stroke belongs to. A change of any of these begins a new one."""

    axis: Axis
    channel: int
    frequency_hz: float
    load_ohm: float | None
    row: int = 0  # of a power statement, whose strokes are told apart
    stroke: int = 0


@attrs.frozen
class PointMark:
    """A point of a power statement: where it stands (W or V, and a plain ratio), and what is written there."""

    x: float
    y: float
    name: str
    words: str
    held: bool


@attrs.define(eq=False)
class Stroke:
    """One stroke: `x` in W, V rms or full scale, `y` as a plain ratio, in the order drawn; NaN where the pen lifted.

    A dotted one was made by steps: its points are kept in the order of x.
    """

    key: Key
    dotted: bool = False
    x: list[float] = attrs.field(factory=list)
    y: list[float] = attrs.field(factory=list)

    def since(self, index: int) -> list[tuple[float, float]]:
        """Return the points from an index on."""
        return list(zip(self.x[index:], self.y[index:], strict=True))


@attrs.define(eq=False)
class Trail:
    """The stroke being drawn and the one before. `version` rises when anything but an appended point changed.

    A power statement adds the strokes `beside` the current one on the same row, its marks, its claimed power and the
    readings that were left out.
    """

    current: Stroke | None = None
    earlier: Stroke | None = None
    now: tuple[float, float] | None = None
    version: int = 0
    beside: list[Stroke] = attrs.field(factory=list)
    marks: tuple[PointMark, ...] = ()
    claimed_w: float | None = None
    left_out: list[tuple[float, float]] = attrs.field(factory=list)

    @property
    def drawn(self) -> bool:
        """Whether any stroke can be seen."""
        return any(stroke is not None and len(stroke.x) > 1 for stroke in (self.current, self.earlier))

    def take(self, reading: Reading, wanted_hz: float) -> None:
        """Add one reading, if it carries an honest point."""
        found = point_of(reading)
        if found is None:
            self.now = None
            self.lift()
            return
        axis, x, y = found
        key = Key(axis, reading.channel, wanted_hz, reading.settings.load_ohm)
        if self.current is None or self.current.key != key:
            self.begin(key)
        self.now = (x, y)
        self._append(x, y)

    def begin(self, key: Key | None = None) -> None:
        """Put the stroke aside as the earlier one and begin the next."""
        if self.current is not None and len(self.current.x) > 1:
            self.earlier = self.current
        self.current = Stroke(key) if key is not None else None
        self.now = None
        self.version += 1

    def lift(self) -> None:
        """Lift the pen: what was refused is not bridged by a line."""
        if self.current is not None and self.current.x and not math.isnan(self.current.x[-1]):
            self.current.x.append(math.nan)
            self.current.y.append(math.nan)

    def clear(self) -> None:
        """Take everything away."""
        self.current = self.earlier = self.now = self.claimed_w = None
        self.beside, self.marks, self.left_out = [], (), []
        self.version += 1

    def _append(self, x: float, y: float) -> None:
        stroke = self.current
        if stroke is None:
            return
        if stroke.x and abs(x / stroke.x[-1] - 1) < _NEAR_X and abs(y / stroke.y[-1] - 1) < _NEAR_Y:
            return
        stroke.x.append(x)
        stroke.y.append(y)
        if len(stroke.x) > _MOST_POINTS:
            kept = [i for i, x in enumerate(stroke.x) if i % 2 == 0 or math.isnan(x)]
            stroke.x, stroke.y = [stroke.x[i] for i in kept], [stroke.y[i] for i in kept]
            self.version += 1


def point_of(reading: Reading) -> tuple[Axis, float, float] | None:
    """Return where a reading stands on the trail, None where it carries no honest point."""
    if reading.state is not State.OK or reading.thdn is None or reading.thdn.value <= 0:
        return None
    ohm = reading.settings.load_ohm
    loaded = ohm is not None and ohm < OPEN_OHM
    for axis, quantity in (
        (Axis.POWER, reading.power_w if loaded else None),
        (Axis.VOLTS, reading.level_vrms),
        (Axis.FULL_SCALE, reading.level_fs),
    ):
        if quantity is not None:
            return (axis, quantity.value, reading.thdn.value) if quantity.value > 0 else None
    return None
