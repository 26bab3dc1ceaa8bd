"""The simulated amplifiers: what each can deliver and by what curve its output bends. All figures are invented.

Each distorts as its kind does: a class-D bridge is clean until its supply stops it, a class-AB stage shows its
crossover at low level, a single-ended class-A stage bends to one side and runs out of bias current. Two have a fault
that a power test must not fall for: a supply that sags under load, and a volume control with a dirty track.
"""

import math

import attrs
import numpy as np

from wattproof.bench.simulated.clipping import Limit, clipped
from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Samples

OPEN_OHM = 1e6  # stands for no load at all: the largest that a Load declares
LOADS_OHM = (4.0, 8.0, OPEN_OHM)


@attrs.frozen
class Electrical:
    """What supply and load make of the amplifier: gain at the terminals, and its limits there, in V."""

    gain: float
    upper_v: float
    lower_v: float


@attrs.frozen
class Scratch:
    """A dirty place on the track of a volume control: where (dB), how wide (dB), and what it takes away (dB)."""

    position_db: float
    width_db: float
    loss_db: float


@attrs.frozen(kw_only=True)
class Character:
    """One kind of amplifier. Voltages are at its output terminals, at full supply unless said otherwise."""

    name: str
    label: str
    bridge_tied: bool
    gain: float  # V/V into an open circuit with the knob at full
    output_ohm: float  # while it is in control
    supply_v: float
    supply_range_v: tuple[float, float]
    supply_share: float  # how much of the supply one side of the output can swing
    drop_v: float  # what the output stage keeps for itself
    rail_ohm: float  # in series with the supply once it is out of control
    bias_a: float = math.inf  # most that a class-A stage can sink
    knee: float = 0.01  # how round the corner is, relative to the limit
    second: float = 0.0  # curvature: ratio of the second harmonic at the limit is half of it
    third: float = 0.0  # likewise, a quarter of it
    crossover_v: float = 0.0  # height of the step at zero
    crossover_width_v: float = 1.0
    noise_vrms: float = 0.0  # white, in 20 kHz
    hum: tuple[tuple[int, float], ...] = ()  # (multiple of the mains, V rms)
    residue: tuple[tuple[float, float], ...] = ()  # (Hz, V rms) left of the switching above the band
    offset_v: float = 0.0
    sag_ohm: float = 0.0  # V that the supply falls per A of mean output current, both channels together
    sag_s: float = 1.0  # time constant of that fall
    scratches: tuple[Scratch, ...] = ()  # of the volume control

    def electrical(self, load_ohm: float, supply_v: float) -> Electrical:
        """Return gain and limits into a load from a supply."""
        swing_v = (self.supply_share * supply_v - self.drop_v) * load_ohm / (load_ohm + self.rail_ohm)
        gain = self.gain * load_ohm / (load_ohm + self.output_ohm)
        return Electrical(gain, swing_v, min(swing_v, self.bias_a * load_ohm))

    def sagged(self, load_ohm: float, supply_v: float, droop_v: float) -> float:
        """Return by what factor the limits are lower while the supply is down by droop_v."""
        whole = self.electrical(load_ohm, supply_v).upper_v
        return self.electrical(load_ohm, supply_v - droop_v).upper_v / whole

    def curve(self, wanted_v: Samples, upper_v: Limit, lower_v: Limit) -> Samples:
        """Return the terminal voltage where wanted_v is wanted: clipped, then bent. Limits are positive."""
        return self.bent(clipped(wanted_v, upper_v, lower_v, self.knee), upper_v)

    def bent(self, limited_v: Samples, upper_v: Limit) -> Samples:
        """Return the terminal voltage for one that is already clipped: curvature and crossover."""
        volts = limited_v
        if self.second or self.third:
            relative = limited_v / upper_v
            volts = limited_v * (1.0 + relative * (self.second + self.third * relative))
        if self.crossover_v:
            volts = volts - self.crossover_v * (limited_v / np.sqrt(limited_v * limited_v + self.crossover_width_v**2))
        return volts


CLASS_D_BRIDGE = Character(
    name="class-d-bridge",
    label="low-voltage class-D bridge",
    bridge_tied=True,
    gain=31.6,
    output_ohm=0.08,
    supply_v=12.0,
    supply_range_v=(8.0, 18.0),
    supply_share=1.0,
    drop_v=0.3,
    rail_ohm=0.35,
    knee=0.004,
    third=-0.0020,
    noise_vrms=110e-6,
    hum=((2, 40e-6), (4, 15e-6)),
    residue=((31_870.0, 1.1e-3), (37_410.0, 2.4e-3), (42_930.0, 1.7e-3)),
    offset_v=6e-3,
)
CLASS_AB_CROSSOVER = Character(
    name="class-ab-crossover",
    label="class-AB with crossover distortion",
    bridge_tied=False,
    gain=56.0,
    output_ohm=0.06,
    supply_v=24.0,
    supply_range_v=(15.0, 26.0),
    supply_share=1.0,
    drop_v=1.6,
    rail_ohm=0.55,
    knee=0.012,
    second=0.0002,
    third=-0.0002,
    crossover_v=5e-3,
    crossover_width_v=0.12,
    noise_vrms=90e-6,
    hum=((1, 110e-6), (2, 180e-6), (3, 50e-6), (4, 60e-6), (6, 30e-6)),
    offset_v=11e-3,
)
CLASS_A_SINGLE = Character(
    name="class-a-single",
    label="single-ended class A",
    bridge_tied=False,
    gain=36.0,
    output_ohm=0.9,
    supply_v=24.0,
    supply_range_v=(15.0, 30.0),
    supply_share=0.5,
    drop_v=0.8,
    rail_ohm=0.6,
    bias_a=1.15,
    knee=0.02,
    second=0.0045,
    third=-0.0006,
    noise_vrms=70e-6,
    hum=((1, 160e-6), (2, 260e-6), (4, 90e-6), (6, 40e-6)),
    offset_v=2e-3,
)
SAGGING_SUPPLY = Character(
    name="sagging-supply",
    label="class-AB on an unregulated supply that sags",
    bridge_tied=False,
    gain=52.0,
    output_ohm=0.05,
    supply_v=25.0,
    supply_range_v=(15.0, 28.0),
    supply_share=1.0,
    drop_v=1.5,
    rail_ohm=0.30,
    knee=0.008,
    second=0.0003,
    third=-0.0003,
    noise_vrms=95e-6,
    hum=((1, 90e-6), (2, 210e-6), (4, 80e-6)),
    offset_v=8e-3,
    sag_ohm=0.60,
    sag_s=0.6,
)
SCRATCHY_CONTROL = Character(
    name="scratchy-control",
    label="class-AB with a scratchy volume control",
    bridge_tied=False,
    gain=48.0,
    output_ohm=0.05,
    supply_v=22.0,
    supply_range_v=(15.0, 25.0),
    supply_share=1.0,
    drop_v=1.4,
    rail_ohm=0.40,
    knee=0.008,
    second=0.0004,
    third=-0.0002,
    noise_vrms=90e-6,
    hum=((1, 80e-6), (2, 120e-6)),
    offset_v=9e-3,
    scratches=tuple(
        Scratch(-43.0 + 1.37 * place, 0.02 + 0.013 * (place % 5), (2.0, 40.0, 0.6, 15.0, 6.0, 0.3)[place % 6])
        for place in range(32)
    ),
)
_ALL = {
    each.name: each for each in (CLASS_D_BRIDGE, CLASS_AB_CROSSOVER, CLASS_A_SINGLE, SAGGING_SUPPLY, SCRATCHY_CONTROL)
}
CHARACTERS = tuple(_ALL)


def character_named(name: str | Character) -> Character:
    """Return a character by name, `simulated:` before it or not; `simulated` alone is the first, one itself is that.

    Raises:
        WrongUseError: there is none of that name.
    """
    if isinstance(name, Character):
        return name
    short = name.removeprefix("simulated").removeprefix(":") or CHARACTERS[0]
    if short not in _ALL:
        raise WrongUseError(f"no simulated amplifier is called {short!a}; there are {', '.join(CHARACTERS)}")
    return _ALL[short]
