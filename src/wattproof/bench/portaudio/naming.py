"""How a device is named: HOST/NAME, by the host API and its own name, never by an index (which changes)."""

from typing import TypedDict


class Entry(TypedDict):
    """One device as PortAudio lists it."""

    host_api: str
    name: str
    inputs: int
    outputs: int
    default_rate_hz: float


class NamingError(Exception):
    """No device, or more than one, answers to the name. The text is one line for a person."""


def choose(entries: list[Entry], text: str) -> tuple[int, int]:
    """Return the places in `entries` of the input and the output device that `text` names.

    `text` is HOST/NAME. HOST is the host API's name or one word of it ("JACK", "ALSA", "WASAPI"); NAME is the device's
    name or a part of it that only one has. Case does not matter; an exact name goes before a part. Where a system
    lists an interface's inputs and outputs as two devices of one name, both are taken.

    Raises:
        NamingError: nothing, or more than one device, answers to it.
    """
    host, slash, name = text.partition("/")
    if not slash or not host.strip() or not name.strip():
        raise NamingError(f"device {text!r} is not HOST/NAME; write for example JACK/loopback")
    there = [place for place, entry in enumerate(entries) if _is_host(entry["host_api"], host)]
    exact = [place for place in there if entries[place]["name"].casefold() == name.strip().casefold()]
    named = exact or [place for place in there if name.strip().casefold() in entries[place]["name"].casefold()]
    if not named:
        known = ", ".join(f"{entry['host_api']}/{entry['name']}" for entry in entries) or "none at all"
        raise NamingError(f"no device {text!r}; there are: {known}")
    return _only(entries, named, text, "inputs"), _only(entries, named, text, "outputs")


def _is_host(host_api: str, asked: str) -> bool:
    asked = asked.strip().casefold()
    return asked == host_api.casefold() or asked in host_api.casefold().split()


def _only(entries: list[Entry], named: list[int], text: str, side: str) -> int:
    able = [place for place in named if (entries[place]["inputs"] if side == "inputs" else entries[place]["outputs"])]
    if not able:
        raise NamingError(f"device {text!r} has no {side}; a duplex device is needed")
    if len(able) > 1:
        which = ", ".join(entries[place]["name"] for place in able)
        raise NamingError(f"device {text!r} may be any of: {which}; write the name in full")
    return able[0]
