"""What every bench can do. Frames are counted absolutely from the opening; nothing here waits longer than told."""

from threading import Event
from typing import Protocol

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.signal import Capture, Tone


@attrs.frozen
class Identity:
    """What a bench is: a name to show, its rate, its sockets, and whether a real amplifier may be behind it."""

    name: str
    rate_hz: float
    inputs: int
    outputs: int
    real: bool


@attrs.frozen
class Control:
    """One control that the bench itself offers (the simulated knob, load switch, supply).

    `choices` are the values of a switch; without them the control is continuous from `minimum` to `maximum`.
    """

    name: str
    label: str
    unit: str
    minimum: float
    maximum: float
    value: float
    help: str
    choices: tuple[float, ...] = ()


class Bench(Protocol):
    """A source of captures that can sound a tone.

    `open` and `close` may each be called once; `close` falls silent with a ramp and never hangs. `mute` may be called
    from any thread.
    """

    @property
    def identity(self) -> Identity:
        """What this bench is."""
        ...

    @property
    def calibration(self) -> Calibration:
        """What the bench itself declares of its scales (the simulator knows them; a device knows nothing)."""
        ...

    def open(self) -> None:
        """Start capturing, in silence.

        Raises:
            WrongUseError: there is no such device, or it refuses what is asked.
        """
        ...

    def close(self) -> None:
        """Fall silent with a ramp and let go of the device, within a deadline."""
        ...

    def play(self, tone: Tone) -> int:
        """Sound a tone (level 0: silence) and return the absolute frame from which it stands in the capture.

        A change of level or frequency is a ramp. While muted nothing sounds.

        Raises:
            BenchLostError: the device is gone.
        """
        ...

    def capture(self, first_frame: int, frames: int, stop: Event) -> Capture:
        """Wait for the frames from first_frame on and return them, with the gaps and overloads they touch.

        Raises:
            StoppedError: `stop` was set while waiting.
            BenchLostError: the device is gone, or the frames were overwritten before they were asked for.
        """
        ...

    @property
    def next_frame(self) -> int:
        """The absolute frame that will be captured next."""
        ...

    def mute(self) -> None:
        """Ramp down at once, from any thread, and stay silent until `release`."""
        ...

    def release(self) -> None:
        """Lift the mute latch; nothing sounds until the next `play`."""
        ...

    @property
    def controls(self) -> tuple[Control, ...]:
        """The controls that the bench itself offers, as they stand."""
        ...

    def turn(self, name: str, value: float) -> None:
        """Set one of the bench's own controls; the amplifier follows as a real one would.

        Raises:
            WrongUseError: no such control, or a value outside its range.
        """
        ...
