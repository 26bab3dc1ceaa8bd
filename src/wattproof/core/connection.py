"""How the interface's sockets can be joined: to the amplifier, or back to its own inputs for a calibration."""

from enum import StrEnum


class Connection(StrEnum):
    """What is plugged where. The values are stable: they are the `want` of an Ask, and stored."""

    AMPLIFIER = "amplifier"  # outputs to the amplifier, inputs behind the attenuator
    DIRECT = "direct"  # each output straight into the input of the same wiring
    PAD = "pad"  # the same, through the attenuator, with the direct loop's load left on the output
    TERMINATED = (
        "terminated"  # the amplifier's inputs plugged off the outputs and terminated; inputs behind the attenuator
    )
