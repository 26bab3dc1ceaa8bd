"""What a power statement is asked to be: the declared settings of `power` and `power-by-hand`, and what follows."""

from enum import StrEnum

import attrs

from wattproof.core import checks
from wattproof.core.fields import declared
from wattproof.core.reading import Reference

START_DBFS = -60.0
BURST_ABOVE_HZ = 5000.0
BURST_BELOW_HZ = 40.0
BURST_STOP_THDN = 0.01
ONE_PER_CENT, TEN_PER_CENT = 0.01, 0.10
ONSET = "onset"


class Driven(StrEnum):
    """Which channels sound while one of them is read."""

    ONE = "one"
    ALL = "all"


class Preset(StrEnum):
    """Whose conditions are listed and ticked off in the statement."""

    NONE = "none"
    FTC = "ftc"
    IEC = "iec"


@attrs.frozen
class Target:
    """A point that is sought: its name, and its THD+N as a plain ratio (None: the onset by its definition)."""

    name: str
    thdn: float | None


@attrs.frozen(kw_only=True)
class PowerPlan:
    """Settings that both ways to a power statement share."""

    loads: str = declared(
        "", label="Loads", unit="Ω", help='nominal loads in order, as "8,4"; empty: the one that the rig has in'
    )
    channels: str = declared("1", label="Channels", help='channels in order, as "1,2", counted from 1')
    driven: Driven = declared(Driven.ONE, label="Driven", help="one channel at a time, or all of them at once")
    frequency_hz: float = declared(
        997.0, label="Frequency", unit="Hz", minimum=10.0, maximum=40_000.0, help="of the test tone"
    )
    own_thdn: float | None = declared(
        None,
        label="Own point",
        unit="1",
        minimum=1e-5,
        maximum=0.5,
        help="a further THD+N at which power is stated, as a plain ratio: 0.003 is 0.3 %",
    )
    onset_thdn: float | None = declared(
        None,
        label="Onset at",
        unit="1",
        minimum=1e-5,
        maximum=0.1,
        help="a fixed THD+N that is called onset, as a plain ratio; without it the project's own definition counts",
    )
    hold_s: float = declared(
        10.0,
        label="Hold",
        unit="s",
        minimum=0.0,
        maximum=3600.0,
        help="how long each point is held before it is called continuous: 10, 60, 300 or any; 0: not held, momentary",
    )
    supply_v: float | None = declared(
        None, label="Supply", unit="V", help="supply voltage, as it stands in the statement", validator=checks.positive
    )
    claimed_w: float | None = declared(
        None, label="Claimed power", unit="W", help="what the box says, a channel", validator=checks.positive
    )
    claimed_supply_v: float | None = declared(
        None, label="Claimed supply", unit="V", help="supply that the claim names", validator=checks.positive
    )
    preset: Preset = declared(
        Preset.NONE, label="Conditions", help="list and tick off the conditions of the FTC's rule or of IEC 60268-3"
    )
    limit_vrms: float | None = declared(
        None, label="Output limit", unit="V rms", help="amplifier voltage that mutes", validator=checks.positive
    )
    limit_w: float | None = declared(
        None, label="Power limit", unit="W", help="power into the load that mutes", validator=checks.positive
    )
    limit_thdn: float | None = declared(
        None,
        label="THD+N limit",
        unit="1",
        minimum=0.001,
        maximum=0.9,
        help="THD+N beyond the onset that mutes, as a plain ratio",
    )
    limit_over_s: float | None = declared(
        None, label="Seconds over rating", unit="s", minimum=0.0, help="time above the load's rated power that mutes"
    )
    drive_vrms: float | None = declared(
        None,
        label="Highest drive",
        unit="V rms",
        minimum=1e-3,
        maximum=50.0,
        help="most that this run drives; never above the rig's limit, which it is without",
    )
    rise_db_per_s: float = declared(
        20.0, label="Rise", unit="dB/s", minimum=1.0, maximum=60.0, help="the drive never rises faster than this"
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
    bursts: bool = declared(
        default=False,
        label="Bursts",
        help="allow a frequency above 5 kHz or below 40 Hz, in short bursts and no further than 1 %",
    )
    low_hz: float = declared(20.0, label="Band from", unit="Hz", minimum=0.0, help="lower edge of the measuring band")
    high_hz: float = declared(
        20_000.0, label="Band to", unit="Hz", minimum=100.0, help="upper edge of the measuring band"
    )
    reference: Reference = declared(
        Reference.TOTAL, label="Ratio to", help="what THD+N is compared with: total signal or fundamental"
    )
    full_scale_vrms: float | None = declared(
        None,
        label="Full scale",
        unit="V rms",
        help="V rms at the amplifier's terminals of a full-scale sine, where no calibration says so",
        validator=checks.positive,
    )

    def __attrs_post_init__(self) -> None:
        numbers("loads", self.loads, 0.1)
        if any(channel != int(channel) for channel in numbers("channels", self.channels, 1.0)) or not self.channels:
            raise ValueError(f'channels is "{self.channels}"; give whole numbers from 1, as 1 or 1,2')
        if self.low_hz >= self.high_hz:
            raise ValueError(f"the band {self.low_hz:g}-{self.high_hz:g} Hz is reversed or empty; low below high")
        if self.in_bursts and not self.bursts:
            raise ValueError(
                f"frequency is {self.frequency_hz:g} Hz; sustained power above {BURST_ABOVE_HZ:g} Hz or below "
                f"{BURST_BELOW_HZ:g} Hz burns parts: stay between, or allow bursts"
            )

    @property
    def loads_ohm(self) -> tuple[float, ...]:
        """The loads in order; none where the rig's own is taken."""
        return numbers("loads", self.loads, 0.1)

    @property
    def channel_list(self) -> tuple[int, ...]:
        """The channels in order, counted from 1."""
        return tuple(int(number) for number in numbers("channels", self.channels, 1.0))

    @property
    def in_bursts(self) -> bool:
        """Whether the frequency is one at which power is only given in bursts."""
        return not BURST_BELOW_HZ <= self.frequency_hz <= BURST_ABOVE_HZ

    @property
    def targets(self) -> tuple[Target, ...]:
        """The points sought, onset first, then by rising THD+N; in bursts none beyond 1 %."""
        wanted = {ONE_PER_CENT, TEN_PER_CENT, *([] if self.own_thdn is None else [self.own_thdn])}
        most = BURST_STOP_THDN if self.in_bursts else 1.0
        ratios = sorted(thdn for thdn in wanted if thdn <= most)
        return (Target(ONSET, self.onset_thdn), *(Target(f"{100.0 * thdn:.6g} %", thdn) for thdn in ratios))

    @property
    def stop_thdn(self) -> float:
        """The THD+N, rising, from which nothing more is sought."""
        return max(target.thdn or 0.0 for target in self.targets)


@attrs.frozen(kw_only=True)
class StepsPlan(PowerPlan):
    """Settings of `power`, which raises its own drive by steps."""

    step_db: float = declared(
        2.0, label="Coarse step", unit="dB", minimum=0.1, maximum=3.0, help="step of the drive on the way up"
    )
    settle_s: float = declared(
        0.25, label="Settling", unit="s", minimum=0.05, maximum=60.0, help="waited after each change of the drive"
    )
    read_s: float = declared(
        1.0, label="Reading", unit="s", minimum=0.1, maximum=10.0, help="length of a reading near a point"
    )


@attrs.frozen(kw_only=True)
class HandPlan(PowerPlan):
    """Settings of `power-by-hand`, which follows the amplifier's own control."""

    strokes: int = declared(
        2, label="Strokes", minimum=1, maximum=2, help="1: up only; 2: up and down again, both drawn and compared"
    )
    stroke_s: float = declared(
        180.0, label="Longest stroke", unit="s", minimum=5.0, maximum=3600.0, help="after which a stroke is over"
    )
    rest_s: float = declared(
        4.0, label="Rest", unit="s", minimum=1.0, maximum=60.0, help="a control that rests this long ends a stroke"
    )


def numbers(name: str, text: str, least: float) -> tuple[float, ...]:
    """Return the numbers of a list "a,b", each once; an empty text is an empty list.

    Raises:
        ValueError: something else, a number below `least`, or one that comes twice.
    """
    parts = [part.strip() for part in text.split(",")] if text.strip() else []
    try:
        numbers = tuple(float(part) for part in parts)
    except ValueError:
        numbers = (0.0,)
    if any(not least <= number <= 1e6 for number in numbers) or len(set(numbers)) != len(numbers):
        raise ValueError(f'{name} is "{text}"; give numbers from {least:g} on, each once, as 8,4')
    return numbers
