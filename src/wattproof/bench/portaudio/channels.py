"""The channel map: which sockets of a device the bench's inputs and outputs are. Child and parent both import it."""

from typing import NamedTuple

from wattproof.bench.portaudio.naming import NamingError

Sockets = int | tuple[int, ...] | None  # how many from the first, or which, from 1; None: as are wanted
MOST_MAPPED = 2  # sockets that are named one by one: two amplifier channels


class Opened(NamedTuple):
    """How many channels of one side are opened, and which of them are used, as columns of the callback's array."""

    opened: int
    columns: slice
    used: int


ALL = Opened(0, slice(None), 0)


class Choice:
    """The sockets that a person chose on both sides, and how that is added to the device's name."""

    def __init__(self, inputs: Sockets, outputs: Sockets) -> None:
        self.inputs = _count(inputs)
        self.outputs = _count(outputs)
        chosen = [(side, which) for side, which in (("in", inputs), ("out", outputs)) if isinstance(which, tuple)]
        listed = "; ".join(f"{side} {', '.join(str(socket) for socket in which)}" for side, which in chosen)
        self.words = f" ({listed})" if listed else ""


def open_sockets(asked: int | list[int] | None, there: int, most: int, whose: str) -> Opened:
    """Return what to open of one side that has `there` sockets; without a wish up to `most` of them.

    Raises:
        NamingError: a socket that is not there, named twice, or more than MOST_MAPPED of them; `whose` begins the line.
    """
    if not isinstance(asked, list):
        count = min(most, there) if asked is None else asked
        if count > there:
            raise NamingError(f"{whose}: it has {there}, not {count}; choose fewer")
        return Opened(count, slice(None), count)
    if not 1 <= len(set(asked)) == len(asked) <= MOST_MAPPED:
        raise NamingError(f"{whose} {asked}: choose one or two, each once")
    beyond = [socket for socket in asked if not 1 <= socket <= there]
    if beyond:
        raise NamingError(f"{whose}: it has 1 to {there}, not {beyond[0]}; choose another")
    first, last = asked[0] - 1, asked[-1] - 1
    step = last - first or 1
    stop = last + step
    return Opened(max(asked), slice(first, stop if stop >= 0 else None, step), len(asked))


def _count(sockets: Sockets) -> int | None:
    return len(sockets) if isinstance(sockets, tuple) else sockets
