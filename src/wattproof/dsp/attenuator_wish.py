"""What an attenuator is asked to do, and what is taken where something is not known."""

import math

import attrs

from wattproof.core.fields import declared
from wattproof.core.units import SINE_PEAK_TO_RMS
from wattproof.dsp.eseries import Series

SINGLE_ENDED_TOLERANCE = 0.01  # common practice, no source: what is in every drawer
BRIDGE_TOLERANCE = 0.001  # rejection needs it: 1 % parts leave 29 dB in the worst case (computed)


@attrs.frozen(kw_only=True)
class Wish:
    """What an attenuator is to do. None is a value that is not known; what is then taken stands in the property."""

    power_w: float = declared(
        label="Power", unit="W", minimum=1e-3, maximum=1e5, help="most that the amplifier is expected to deliver"
    )
    load_ohm: float = declared(label="Load", unit="Ω", minimum=0.5, maximum=1e5, help="resistance that takes the power")
    full_scale_vrms: float = declared(
        label="Full scale", unit="V rms", minimum=1e-2, maximum=100.0, help="V rms of a full-scale sine at the input"
    )
    input_ohm: float = declared(
        label="Input impedance",
        unit="Ω",
        minimum=100.0,
        maximum=1e8,
        help="of the input; of a balanced one between its pins",
    )
    bridge_tied: bool = declared(default=False, label="Bridge-tied", help="both output terminals are driven")
    two_inputs: bool = declared(
        default=False, label="Two inputs", help="no balanced input: each leg has an unbalanced input of its own"
    )
    series: Series = declared(Series.E96, label="Series", help="preferred values to choose from (IEC 60063)")
    tolerance: float | None = declared(
        None, label="Tolerance", unit="1", minimum=1e-6, maximum=0.1, help="of each resistor, as a plain ratio"
    )
    input_tolerance: float = declared(
        0.2, label="Input impedance tolerance", unit="1", minimum=0.0, maximum=0.5, help="as a plain ratio"
    )
    rail_v: float | None = declared(
        None,
        label="Rail",
        unit="V",
        minimum=1e-2,
        maximum=2000.0,
        help="highest voltage of an output terminal against ground",
    )
    cable_pf: float = declared(
        300.0, label="Cable", unit="pF", minimum=0.0, maximum=1e5, help="capacitance from each pin to ground"
    )
    input_limit_v: float | None = declared(
        None, label="Input limit", unit="V", minimum=1e-2, maximum=1000.0, help="peak volts that one pin stands"
    )
    input_limit_ma: float = declared(
        10.0, label="Input current limit", unit="mA", minimum=0.1, maximum=1000.0, help="that one pin stands"
    )
    interface_noise_vrms: float | None = declared(
        None, label="Interface noise", unit="V rms", minimum=1e-9, maximum=1.0, help="at the input, 20 Hz to 20 kHz"
    )
    common_mode_vrms: float = declared(
        0.1,
        label="Common hum",
        unit="V rms",
        minimum=0.0,
        maximum=1000.0,
        help="hum that both terminals have in common",
    )
    clamp_pf: float | None = declared(
        None, label="Clamp", unit="pF", minimum=0.1, maximum=1e5, help="a clamp's capacitance from a pin, at 0 V"
    )

    def __attrs_post_init__(self) -> None:
        if self.two_inputs and not self.bridge_tied:
            raise ValueError("two inputs are for a bridge-tied output; leave them out, or state that it is one")
        if self.rail_v is not None and self.rail_v < self.terminal_peak_v * (1.0 - 1e-9):
            raise ValueError(
                f"rail is {self.rail_v:g} V, but {self.power_w:g} W into {self.load_ohm:g} Ω swings to "
                f"{self.terminal_peak_v:.4g} V; give at least that, or less power"
            )

    @property
    def full_vrms(self) -> float:
        """The voltage across the load at full power, V rms."""
        return math.sqrt(self.power_w * self.load_ohm)

    @property
    def terminal_peak_v(self) -> float:
        """The least rail that full power needs, V: a bridge's terminals swing over all of it between them."""
        return self.full_vrms * SINE_PEAK_TO_RMS

    @property
    def rail(self) -> float:
        """The highest voltage of a terminal against ground: as stated, else the least that the power needs."""
        return self.terminal_peak_v if self.rail_v is None else self.rail_v

    @property
    def part_tolerance(self) -> float:
        """The tolerance of each part: as stated, else 0.1 % for a bridge and 1 % otherwise."""
        if self.tolerance is not None:
            return self.tolerance
        return BRIDGE_TOLERANCE if self.bridge_tied else SINGLE_ENDED_TOLERANCE

    @property
    def pin_limit_v(self) -> float:
        """What one pin stands, V peak: as stated, else the peak of full scale, which its input takes by definition."""
        return self.full_scale_vrms * SINE_PEAK_TO_RMS if self.input_limit_v is None else self.input_limit_v

    @property
    def is_balanced(self) -> bool:
        """Whether both terminals go to the pins of one balanced input."""
        return self.bridge_tied and not self.two_inputs

    @property
    def pin_ohm(self) -> float:
        """The input's resistance from one pin to ground: half of that between the pins of a balanced input."""
        return self.input_ohm / 2.0 if self.is_balanced else self.input_ohm

    @property
    def shared_pin_ohm(self) -> float:
        """What a pin has to ground for what both pins share: a balanced input may have nothing, so that is taken."""
        return math.inf if self.is_balanced else self.pin_ohm

    @property
    def seen_vrms(self) -> float:
        """What one input sees of the output at full power, less the attenuation: half where two inputs share it."""
        return self.full_vrms / 2.0 if self.two_inputs else self.full_vrms

    @property
    def running_vrms(self) -> float:
        """What stands at a terminal at full power, V rms, DC included: a bridge's terminals rest at half the rail."""
        return math.hypot(self.rail / 2.0, self.full_vrms / 2.0) if self.bridge_tied else self.full_vrms
