"""What is plugged where on the simulated table: the amplifier, or the interface's outputs back into its inputs."""

import attrs

from wattproof.core import checks
from wattproof.core.connection import Connection
from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Samples


@attrs.frozen(kw_only=True)
class Mistake:
    """What a person may have plugged wrongly in a loop; nothing by itself."""

    swapped: bool = False  # output 1 into input 2 and the other way round
    inverted: tuple[int, ...] = ()  # inputs whose cable turns the sign
    unplugged: tuple[int, ...] = ()  # inputs whose cable is missing
    no_pad: bool = False  # the direct cable was left where the pad should be
    monitoring: float = attrs.field(default=0.0, validator=checks.within(0.0, 0.9))  # input back to its own output


@attrs.frozen
class Table:
    """One state of the table."""

    connection: Connection = Connection.AMPLIFIER
    mistake: Mistake = Mistake()

    @property
    def is_loop(self) -> bool:
        """Whether the outputs go back into the inputs."""
        return self.connection in {Connection.DIRECT, Connection.PAD}

    @property
    def is_terminated(self) -> bool:
        """Whether the amplifier's inputs are plugged off and terminated."""
        return self.connection is Connection.TERMINATED

    def joined(self, output_v: Samples, attenuator_ratio: float) -> Samples:
        """Return what stands before the divider, shape (channels, frames), for voltages at the outputs.

        Direct means that the divider is not there, so its ratio is put back.
        """
        direct = self.connection is Connection.DIRECT or self.mistake.no_pad
        volts = output_v * attenuator_ratio if direct else output_v.copy()
        if self.mistake.swapped:
            volts = volts[::-1].copy()
        for socket in self.mistake.inverted:
            volts[socket - 1] *= -1.0
        for socket in self.mistake.unplugged:
            volts[socket - 1] = 0.0
        return volts


def connection_named(name: str) -> Connection:
    """Return a connection by its name.

    Raises:
        WrongUseError: there is none of that name.
    """
    try:
        return Connection(name)
    except ValueError as error:
        names = ", ".join(each.value for each in Connection)
        raise WrongUseError(f"the simulated table cannot be plugged as {name!a}; it can be {names}") from error
