"""What is known of an interface: volts per full scale, its own floors and its response, with dates."""

import attrs

from wattproof.core import checks
from wattproof.core.loopback import Loop, Response
from wattproof.core.quantity import Quantity


@attrs.frozen
class Scale:
    """V rms of a full-scale sine at one socket (0 dBFS, AES17), counted from 1, and how it came to be known."""

    socket: int = attrs.field(validator=checks.counted_from_one)
    full_scale_vrms: Quantity
    origin: str  # "measured", "typed" or "declared by the simulator"
    date: str  # ISO 8601


@attrs.frozen(eq=False)
class Floor:
    """What one converter adds by itself: harmonics by order (ratio to the fundamental) and noise, at one level."""

    socket: int = attrs.field(validator=checks.counted_from_one)
    level_fs: float = attrs.field(validator=checks.not_negative)
    noise_fs: Quantity
    harmonics: tuple[tuple[int, Quantity], ...] = ()
    phases_rad: tuple[float, ...] = ()  # of the harmonics in the same order, φk in sin θ + Σ ak·sin(kθ + φk)


@attrs.frozen(eq=False)
class Calibration:
    """Everything known of one device at one rate. An empty one says that nothing is: levels then stay in dBFS."""

    device: str = ""
    rate_hz: float | None = None
    inputs: tuple[Scale, ...] = ()
    outputs: tuple[Scale, ...] = ()
    out_floors: tuple[Floor, ...] = ()
    in_floors: tuple[Floor, ...] = ()
    response: Response = attrs.field(factory=Response)
    date: str = ""  # ISO 8601, of the calibration by loopback; empty where there was none
    sample_format: str = ""  # as the device delivered it, for example "24 bit"
    loops: tuple[Loop, ...] = ()

    def loop(self, socket: int) -> Loop | None:
        """The loop that was measured into an input, or None."""
        return next((loop for loop in self.loops if loop.input == socket), None)

    def input_vrms(self, socket: int) -> Quantity | None:
        """V rms of full scale at an input, or None where it is not known."""
        return next((scale.full_scale_vrms for scale in self.inputs if scale.socket == socket), None)

    def output_vrms(self, socket: int) -> Quantity | None:
        """V rms of full scale at an output, or None where it is not known."""
        return next((scale.full_scale_vrms for scale in self.outputs if scale.socket == socket), None)
