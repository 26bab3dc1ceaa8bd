"""How a bench is named together with its rate and sockets: `JACK/loopback rate=48000 in=3,5 out=7`."""

import attrs

from wattproof.core.errors import WrongUseError

LOWEST_HZ, HIGHEST_HZ = 8_000.0, 768_000.0  # what interfaces are built for, with room; 44.1 to 192 kHz is the use here
MOST_SOCKETS = 2  # a side: two amplifier channels
_SETTINGS = ("rate", "in", "out")


@attrs.frozen
class Opening:
    """What is asked of a bench beside its name; None leaves it to the bench.

    `inputs` and `outputs` are the device's sockets, counted from 1, in the order in which they become the bench's.
    """

    rate_hz: float | None = None
    inputs: tuple[int, ...] | None = None
    outputs: tuple[int, ...] | None = None


def named_opening(text: str) -> tuple[str, Opening]:
    """Return the bench's own name and what is asked beside it: ` rate=HZ`, ` in=N,M` and ` out=N,M` at its end.

    Raises:
        WrongUseError: a setting that cannot be.
    """
    given: dict[str, str] = {}
    name = text
    while True:
        before, blank, last = name.rstrip().rpartition(" ")
        setting, equals, value = last.partition("=")
        if not (blank and equals and setting in _SETTINGS):
            break
        if setting in given:
            raise WrongUseError(f"{setting}= is given twice in {text!a}; give it once")
        given[setting] = value
        name = before.rstrip()
    rate_hz = _rate(given["rate"]) if "rate" in given else None
    return name, Opening(rate_hz, _sockets("in", given), _sockets("out", given))


def _rate(text: str) -> float:
    try:
        rate_hz = float(text)
    except ValueError:
        rate_hz = 0.0
    if not LOWEST_HZ <= rate_hz <= HIGHEST_HZ:
        raise WrongUseError(f"rate={text}: give the rate in Hz, for example rate=96000")
    return rate_hz


def _sockets(side: str, given: dict[str, str]) -> tuple[int, ...] | None:
    if side not in given:
        return None
    parts = given[side].split(",")
    sockets = tuple(int(part) for part in parts if part.isascii() and part.isdecimal())
    if len(sockets) != len(parts) or not 1 <= len(set(sockets)) == len(sockets) <= MOST_SOCKETS or min(sockets) < 1:
        raise WrongUseError(f"{side}={given[side]}: give one socket or two, counted from 1, for example {side}=3,4")
    return sockets
