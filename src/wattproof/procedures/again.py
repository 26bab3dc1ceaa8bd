"""Reads a kept block once more from its raw samples, with today's code and what the run had written down."""

from collections.abc import Mapping, Sequence
from types import MappingProxyType

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, State
from wattproof.core.rig import Rig
from wattproof.core.signal import Capture
from wattproof.dsp.live import LiveReader
from wattproof.procedures.absolute import absolute
from wattproof.procedures.curve_reader import curve_reader
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan
from wattproof.procedures.power_rows import Place, Row, settings_of, wired_as
from wattproof.procedures.requests import Kept, Mark, Role

PLANS: Mapping[str, type[PowerPlan]] = MappingProxyType({"power": StepsPlan, "power-by-hand": HandPlan})
STEPS, BY_HAND = PLANS


def name_of(plan: PowerPlan) -> str:
    """Return the name under which runs with such a plan are kept."""
    return next(name for name, kind in PLANS.items() if isinstance(plan, kind))


@attrs.frozen(eq=False)
class Conditions:
    """What a run was measured under: enough to read its blocks again."""

    plan: PowerPlan
    rows: Sequence[Row]
    rig: Rig
    calibration: Calibration
    rate_hz: float
    inputs: int


class Again:
    """Reads blocks of one run again. It is told what the reader had followed when the block was live: the frequency."""

    def __init__(self, conditions: Conditions) -> None:
        self._conditions = conditions
        self._place = Place(
            conditions.rate_hz, conditions.inputs, conditions.rig, conditions.calibration, {}, curve_reader, real=False
        )
        self._readers: dict[int, LiveReader] = {}

    def read(self, kept: Kept, block: Capture) -> Reading:
        """Return the reading of a block that was kept."""
        return self._read(kept, block, picture=False)[0]

    def draw(self, kept: Kept, block: Capture) -> Picture | None:
        """Return the picture of a block that was kept: residual, waveform and spectrum."""
        return self._read(kept, block, picture=True)[1]

    def _read(self, kept: Kept, block: Capture, *, picture: bool) -> tuple[Reading, Picture | None]:
        was, mark = kept.reading, kept.mark or Mark(Role.STEP)
        row = self._conditions.rows[mark.row]
        reader = self._reader(row)
        hz = self._conditions.plan.frequency_hz if was.fundamental_hz is None else was.fundamental_hz.value
        told_frame = block.span.end_frame if was.state is State.OK else -1
        reader.follow(hz, told_frame)
        readings, drawn = reader.take(block, was.channel if picture else None)
        reading = readings[was.channel - 1]
        if self._conditions.plan.full_scale_vrms is None:
            rig = wired_as(self._conditions.rig, row)
            reading = absolute(reading, rig, self._conditions.calibration, mark.drive_fs or None)
        return reading, drawn

    def _reader(self, row: Row) -> LiveReader:
        if row.index not in self._readers:
            settings = settings_of(self._conditions.plan, self._place, row)
            self._readers[row.index] = curve_reader(self._conditions.rate_hz, settings)
        return self._readers[row.index]
