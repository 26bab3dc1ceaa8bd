"""What is wired between the interface's sockets: which output drives, which input captures, and what is between."""

import attrs

from wattproof.core import checks
from wattproof.core.fields import declared


@attrs.frozen
class Load:
    """The resistor that takes the power. `rated_w` is as mounted.

    `measured_ohm` (cold) and `hot_ohm` are four-wire, from DC current and voltage at its terminals: the 0.1 Ω that a
    handheld ohmmeter adds is 2.5 % of the power at 4 Ω.
    """

    nominal_ohm: float = declared(8.0, label="Load", unit="Ω", minimum=0.1, maximum=1e6, help="nominal load")
    measured_ohm: float | None = declared(
        None, label="Measured load", unit="Ω", help="four-wire, at its terminals", validator=checks.positive
    )
    rated_w: float | None = declared(
        None, label="Load rating", unit="W", help="continuous rating as mounted", validator=checks.positive
    )
    hot_ohm: float | None = declared(
        None, label="Hot load", unit="Ω", help="four-wire, straight after full power", validator=checks.positive
    )
    accuracy: float = declared(
        0.005, label="Load accuracy", unit="1", minimum=0.0, maximum=0.2, help="limits of the measured Ω, plain ratio"
    )
    tolerance: float = declared(
        0.05, label="Load tolerance", unit="1", minimum=0.0, maximum=0.5, help="of the nominal Ω where none is measured"
    )
    temperature_per_k: float = declared(
        0.0, label="Temperature coefficient", unit="1/K", minimum=-0.01, maximum=0.01, help="0.0001 is 100 ppm/K"
    )
    rise_k: float = declared(
        0.0, label="Temperature rise", unit="K", minimum=0.0, maximum=500.0, help="most that it warms during a run"
    )
    inductance_h: float = declared(
        0.0, label="Inductance", unit="H", minimum=0.0, maximum=0.01, help="in series; counts above 2 kHz"
    )

    @property
    def ohm(self) -> float:
        """The resistance to reckon with: nominal where none was measured, else the middle between cold and hot."""
        return sum(self.ends_ohm) / 2.0

    @property
    def ends_ohm(self) -> tuple[float, float]:
        """Cold and hot, as measured or as the temperature coefficient makes them; both nominal where none was."""
        warming = 1.0 + self.temperature_per_k * self.rise_k
        if self.measured_ohm is None and self.hot_ohm is None:
            return self.nominal_ohm, self.nominal_ohm
        if self.measured_ohm is None:
            return (self.hot_ohm or 0.0) / warming, self.hot_ohm or 0.0
        return self.measured_ohm, self.measured_ohm * warming if self.hot_ohm is None else self.hot_ohm


@attrs.frozen
class Attenuator:
    """The resistive divider from the amplifier's output to the input: `ratio` is volts in over volts out."""

    ratio: float = declared(1.0, label="Attenuator", unit="÷", minimum=1.0, maximum=1e5, help="volts in over volts out")
    rated_vrms: float | None = declared(
        None, label="Attenuator limit", unit="V rms", help="most that its parts stand", validator=checks.positive
    )
    r1a_ohm: float | None = declared(None, label="R1a", unit="Ω", help="in series", validator=checks.positive)
    r1b_ohm: float | None = declared(
        None,
        label="R1b",
        unit="Ω",
        help="in series with R1a, so that no one short bridges R1",
        validator=checks.positive,
    )
    r2a_ohm: float | None = declared(None, label="R2a", unit="Ω", help="to ground", validator=checks.positive)
    r2b_ohm: float | None = declared(
        None,
        label="R2b",
        unit="Ω",
        help="parallel to R2a, so that no one open part unloads it",
        validator=checks.positive,
    )
    tolerance: float = declared(
        0.01, label="Tolerance", unit="1", minimum=0.0, maximum=0.2, help="of each resistor, as a plain ratio"
    )
    input_ohm: float | None = declared(
        None, label="Input impedance", unit="Ω", help="of one pin of the input to ground", validator=checks.positive
    )
    input_tolerance: float = declared(
        0.2, label="Input impedance tolerance", unit="1", minimum=0.0, maximum=0.5, help="as a plain ratio"
    )
    cable_pf: float = declared(
        300.0, label="Cable", unit="pF", minimum=0.0, maximum=1e5, help="capacitance from the pin to ground"
    )
    measured_accuracy: float | None = declared(
        None,
        label="Ratio accuracy",
        unit="1",
        minimum=0.0,
        maximum=0.2,
        help="where the ratio was measured, not computed: its limits as a plain ratio",
    )
    input_limit_v: float | None = declared(
        None,
        label="Input limit",
        unit="V",
        help="peak volts that one pin of the input stands",
        validator=checks.positive,
    )


@attrs.frozen
class Wiring:
    """One amplifier channel: output n drives it, input m captures it through the attenuator, counted from 1."""

    name: str = declared("left", label="Channel", help="how the amplifier's channel is called")
    output: int = declared(1, label="Drive output", minimum=1, help="interface output that drives it")
    input: int = declared(1, label="Capture input", minimum=1, help="interface input that captures it")
    load: Load = attrs.field(factory=Load)
    attenuator: Attenuator = attrs.field(factory=Attenuator)
    bridge_tied: bool = declared(
        default=False, label="Bridge-tied", help="both output terminals are driven; neither is ground"
    )
    drive_path: str = declared("", label="Drive path", help="what stands between the output and the amplifier's input")


@attrs.frozen
class Limits:
    """What the program never exceeds. A person raises a limit, the program never does."""

    drive_vrms: float = declared(
        1.0, label="Drive limit", unit="V rms", minimum=0.0, maximum=50.0, help="most that the output may drive"
    )
    output_vrms: float | None = declared(
        None, label="Output limit", unit="V rms", help="amplifier voltage that mutes", validator=checks.positive
    )
    power_w: float | None = declared(
        None, label="Power limit", unit="W", help="power into the load that mutes", validator=checks.positive
    )
    thdn: float | None = declared(
        None, label="THD+N limit", unit="1", help="THD+N that mutes, as a plain ratio", validator=checks.positive
    )
    over_rating_s: float | None = declared(
        None, label="Seconds over rating", unit="s", minimum=0.0, help="time above the load's rated power that mutes"
    )


@attrs.frozen
class Rig:
    """A named wiring of one or two amplifier channels and its limits."""

    name: str = declared("bench", label="Rig", help="name of this wiring")
    wirings: tuple[Wiring, ...] = attrs.field(factory=lambda: (Wiring(),))
    limits: Limits = attrs.field(factory=Limits)
    interface: str = declared("", label="Interface", help="the device, as the list of devices names it")
    note: str = declared("", label="Note", help="what else is worth knowing: date, meter, serial numbers")

    def __attrs_post_init__(self) -> None:
        if not self.wirings:
            raise ValueError("Rig.wirings is empty; a rig wires at least one channel")
        inputs = [wiring.input for wiring in self.wirings]
        if len(set(inputs)) != len(inputs):
            raise ValueError(f"Rig.wirings use inputs {inputs}; each channel needs an input of its own")
