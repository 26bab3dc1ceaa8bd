"""What the procedures around the power statement share: their declared settings, and the place they work at."""

import math

import attrs

from wattproof.core import checks
from wattproof.core.fields import declared
from wattproof.procedures.power_plan import Driven, PowerPlan
from wattproof.procedures.power_rows import Place

REFERENCE_HZ = 997.0  # levels are set here: no multiple of the mains, and far from couplings and filters

MAINS_HZ = (50.0, 60.0)
HUM_ENDS_HZ = 2_000.0


@attrs.frozen(eq=False)
class AroundPlace(Place):
    """The place, and what its bench is like.

    `phase_from_zero`: a tone's phase counts from the absolute frame 0; else from the frame at which it begins.
    """

    phase_from_zero: bool = False


@attrs.frozen(kw_only=True)
class AroundPlan:
    """Settings that all of them share. Limits mean what they mean for the power statement."""

    channels: str = declared("1,2", label="Channels", help='channels in order, as "1,2", counted from 1')
    loads: str = declared(
        "", label="Loads", unit="Ω", help='nominal loads in order, as "8,4"; empty: the one that the rig has in'
    )
    limit_vrms: float | None = declared(
        None, label="Output limit", unit="V rms", help="amplifier voltage that mutes", validator=checks.positive
    )
    limit_w: float | None = declared(
        None, label="Power limit", unit="W", help="power into the load that mutes", validator=checks.positive
    )
    limit_thdn: float | None = declared(
        None, label="THD+N limit", unit="1", minimum=0.001, maximum=0.9, help="THD+N that mutes, as a plain ratio"
    )
    drive_vrms: float | None = declared(
        None,
        label="Highest drive",
        unit="V rms",
        minimum=1e-3,
        maximum=50.0,
        help="most that this run drives; never above the rig's limit, which it is without",
    )
    load_printed_w: float | None = declared(
        None,
        label="Load's printed watts",
        unit="W",
        help="what is printed on the load, where the rig holds no rating as mounted",
        validator=checks.positive,
    )
    heat_sink: bool = declared(
        default=False, label="Heat sink", help="the load sits on its stated heat sink; a third of its watts counts else"
    )
    valve: bool = declared(default=False, label="Valves", help="a valve amplifier, which never runs without a load")
    low_hz: float = declared(20.0, label="Band from", unit="Hz", minimum=0.0, help="lower edge of the measuring band")
    high_hz: float = declared(
        20_000.0, label="Band to", unit="Hz", minimum=100.0, help="upper edge of the measuring band"
    )
    full_scale_vrms: float | None = declared(
        None,
        label="Full scale",
        unit="V rms",
        help="V rms at the amplifier's terminals of a full-scale sine, where no calibration says so",
        validator=checks.positive,
    )

    def __attrs_post_init__(self) -> None:
        self.guarded()

    def guarded(self, frequency_hz: float = REFERENCE_HZ, driven: Driven = Driven.ONE) -> PowerPlan:
        """Return what the guard needs to know while a tone of this frequency sounds.

        Raises:
            ValueError: the settings do not fit together; the line is the field's own.
        """
        return PowerPlan(
            channels=self.channels,
            loads=self.loads,
            driven=driven,
            frequency_hz=frequency_hz,
            bursts=True,
            hold_s=0.0,
            limit_vrms=self.limit_vrms,
            limit_w=self.limit_w,
            limit_thdn=self.limit_thdn,
            drive_vrms=self.drive_vrms,
            load_printed_w=self.load_printed_w,
            heat_sink=self.heat_sink,
            valve=self.valve,
            low_hz=self.low_hz,
            high_hz=self.high_hz,
            full_scale_vrms=self.full_scale_vrms,
        )


def frequencies(low_hz: float, high_hz: float, per_octave: float, clear_hz: float = 0.0) -> tuple[float, ...]:
    """Return tones from low to high, both included, evenly spaced on a log scale at least so densely.

    With `clear_hz` a tone that is nearer to a multiple of 50 or 60 Hz moves up until it is clear, so that a faint line
    is not taken for hum; above HUM_ENDS_HZ there is none that counts.
    """
    steps = max(1, math.ceil(per_octave * math.log2(high_hz / low_hz) - 1e-9))
    ratio = (high_hz / low_hz) ** (1.0 / steps)
    return tuple(_clear(low_hz * ratio**step, clear_hz) for step in range(steps + 1))


def _clear(tone_hz: float, clear_hz: float) -> float:
    moved = tone_hz
    while (
        clear_hz
        and moved < HUM_ENDS_HZ
        and any(abs(moved - mains * round(moved / mains)) < clear_hz for mains in MAINS_HZ)
    ):
        moved += 0.5
    return moved
