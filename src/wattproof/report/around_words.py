"""What a person is asked by the procedures around the power statement."""

from wattproof.core.connection import Connection
from wattproof.procedures.crosstalk import UNDRIVEN
from wattproof.procedures.efficiency import SUPPLY
from wattproof.procedures.gain import AT
from wattproof.procedures.requests import Action, Ask
from wattproof.procedures.response import FLAT, SET

_TURNS = {
    FLAT: "Set tone controls, filters and loudness flat or off; nothing sounds meanwhile",
    SET: "Set tone controls, filters and loudness as they are to be shown; nothing sounds meanwhile",
}
_CONNECTS = {
    Connection.TERMINATED.value: (
        "Unplug the amplifier's inputs from the interface and terminate them: a short, or the source impedance that is "
        "stated; leave the volume control where it is"
    ),
    Connection.DIRECT.value: (
        "Take the cables off the amplifier and join output to input directly ({check}); leave all gain knobs alone"
    ),
    Connection.AMPLIFIER.value: "Join the amplifier again: outputs to its inputs, its terminals to the attenuator",
    UNDRIVEN: "Terminate the input of {check} with its source impedance; it is not driven now",
}


def around_asked(ask: Ask) -> str | None:
    """Return the question in one sentence without a full stop, or None where it is none of these."""
    want = str(ask.want)
    if ask.action is Action.TURN and want in _TURNS:
        return _TURNS[want]
    if ask.action is Action.TURN and want.startswith(AT):
        return f"Turn the volume control to {want.removeprefix(AT)}; nothing sounds meanwhile"
    if ask.action is Action.CONNECT and want in _CONNECTS:
        return _CONNECTS[want].format(check=ask.check)
    if ask.action is Action.CONFIRM and want == SUPPLY:
        return f"Read volts and amperes of the supply while the tone sounds, {ask.check}, and give them as 12.1:0.35"
    return None
