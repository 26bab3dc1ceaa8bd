"""What keeps parts and people whole during a power test: heat, presence, a sudden fall, bursts, the first power-up.

The cooling model is a single time constant and no clearance to touch anything: a load that the model calls cool may
burn skin. It only ends a test in time. Work on the mains side belongs to those trained and licensed for it.
"""

import math

import attrs

from wattproof.core import checks

UNMOUNTED_SHARE = 1.0 / 3.0  # of the printed watts without the stated heat sink: common practice, no source
COOLING_S = 60.0  # time constant of a mid-sized wirewound resistor in free air: common practice, no source
PRESENCE_SHARE = 0.25  # of any part's rating: above it a person stays beside
PRESENCE_S = 120.0
PRESENCE_WARNING_S = 30.0  # how long before the end of that time the question comes
FALL_DB = 10.0  # between two readings at the same drive; no supply sags that fast and that far
BURST_S = 0.5
BURST_DUTY = 0.2

FIRST_POWER_UP = (
    "feed it through a current-limited supply, or a series lamp on the mains side, and watch the current",
    "mains work is for people who are trained and licensed for it; local codes come before this page",
    "measure the DC offset at the output with a meter before any load is connected; above 0.1 V find out why first",
    "no loudspeaker: a dummy load only, and one that is rated for what the amplifier may deliver",
    "unplug headphones: other outputs of the interface and the amplifier may carry the test tone",
    "keep hands off the load, its wires and the heat sinks; they stay hot for minutes after the tone",
)
PARTS_BURNT_HIGH = "the Zobel network and the output filter"
PARTS_BURNT_LOW = "the output transformer, if there is one"


def mounted_w(rated_w: float | None, printed_w: float | None, *, heat_sink: bool) -> float | None:
    """Return the watts that a load stands as mounted: its stated rating, else what is printed, else None."""
    if rated_w is not None or printed_w is None:
        return rated_w
    return printed_w if heat_sink else printed_w * UNMOUNTED_SHARE


@attrs.define
class Heat:
    """One part's temperature rise as a share of its rise at rated power, by one cooling time constant."""

    part: str
    rated_w: float = attrs.field(validator=checks.positive)
    cooling_s: float = COOLING_S
    share: float = 0.0
    over_s: float = 0.0  # time above the rated power so far

    def spend(self, power_w: float, seconds: float) -> None:
        """Take a power for some time."""
        target = power_w / self.rated_w
        self.share = target + (self.share - target) * math.exp(-seconds / self.cooling_s)
        if target > 1.0:
            self.over_s += seconds

    def left_s(self, power_w: float) -> float:
        """Return for how long the part stands a power from now; infinite where it does for good."""
        target = power_w / self.rated_w
        if self.share >= 1.0:
            return 0.0 if target >= 1.0 else math.inf
        if target <= 1.0:
            return math.inf
        return self.cooling_s * math.log((target - self.share) / (target - 1.0))


@attrs.define
class Presence:
    """Whether somebody is there while parts get warm. Time is counted in seconds of captured sound."""

    said: int = 0
    since_s: float = 0.0
    asked: bool = False

    def pass_time(self, seconds: float, *, warm: bool, said: int) -> None:
        """Let time pass; `warm`: a part is above a quarter of its rating; `said`: how often "I am here" was said."""
        if said != self.said or not warm:
            self.said, self.since_s, self.asked = said, 0.0, False
            return
        self.since_s += seconds

    @property
    def due(self) -> bool:
        """Whether it is time to ask, once."""
        return not self.asked and self.since_s >= PRESENCE_S - PRESENCE_WARNING_S

    @property
    def missed(self) -> bool:
        """Whether the time is over without an answer."""
        return self.since_s > PRESENCE_S


def fell(before_vrms: float, expected_ratio: float, now_vrms: float) -> float:
    """Return by how many dB an output is below what the last one and the drive let expect; 0 where it is not far."""
    expected = before_vrms * min(expected_ratio, 1.0)
    if now_vrms >= expected * 10.0 ** (-FALL_DB / 20.0):
        return 0.0
    return 20.0 * math.log10(expected / max(now_vrms, 1e-9))


def pause_s(burst_s: float) -> float:
    """Return how long to be silent after a burst, so that the duty is kept."""
    return burst_s * (1.0 / BURST_DUTY - 1.0)


def parts_burnt(frequency_hz: float) -> str:
    """Return which parts sustained power at an unusual frequency burns."""
    return PARTS_BURNT_HIGH if frequency_hz > 1000.0 else PARTS_BURNT_LOW
