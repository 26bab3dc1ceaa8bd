"""What is wired between the interface's sockets: which output drives, which input captures, and what is between."""

import attrs

from wattproof.core.fields import declared


@attrs.frozen
class Load:
    """The resistor that takes the power. `rated_w` is as mounted; `measured_ohm` is four-wire at its terminals."""

    nominal_ohm: float = declared(8.0, label="Load", unit="Ω", minimum=0.1, maximum=1e6, help="nominal load")
    measured_ohm: float | None = declared(None, label="Measured load", unit="Ω", help="four-wire, at its terminals")
    rated_w: float | None = declared(None, label="Load rating", unit="W", help="continuous rating as mounted")

    @property
    def ohm(self) -> float:
        """The resistance to reckon with: measured where it was, else nominal."""
        return self.nominal_ohm if self.measured_ohm is None else self.measured_ohm


@attrs.frozen
class Attenuator:
    """The resistive divider from the amplifier's output to the input: `ratio` is volts in over volts out."""

    ratio: float = declared(1.0, label="Attenuator", unit="÷", minimum=1.0, maximum=1e5, help="volts in over volts out")
    rated_vrms: float | None = declared(None, label="Attenuator limit", unit="V rms", help="most that its parts stand")


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


@attrs.frozen
class Limits:
    """What the program never exceeds. A person raises a limit, the program never does."""

    drive_vrms: float = declared(
        1.0, label="Drive limit", unit="V rms", minimum=0.0, maximum=50.0, help="most that the output may drive"
    )
    output_vrms: float | None = declared(None, label="Output limit", unit="V rms", help="amplifier voltage that mutes")
    power_w: float | None = declared(None, label="Power limit", unit="W", help="power into the load that mutes")
    thdn: float | None = declared(None, label="THD+N limit", unit="1", help="THD+N that mutes, as a plain ratio")


@attrs.frozen
class Rig:
    """A named wiring of one or two amplifier channels and its limits."""

    name: str = declared("bench", label="Rig", help="name of this wiring")
    wirings: tuple[Wiring, ...] = attrs.field(factory=lambda: (Wiring(),))
    limits: Limits = attrs.field(factory=Limits)

    def __attrs_post_init__(self) -> None:
        if not self.wirings:
            raise ValueError("Rig.wirings is empty; a rig wires at least one channel")
        inputs = [wiring.input for wiring in self.wirings]
        if len(set(inputs)) != len(inputs):
            raise ValueError(f"Rig.wirings use inputs {inputs}; each channel needs an input of its own")
