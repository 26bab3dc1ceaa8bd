"""What is likely to change the samples on their way to a device, and what to choose: by host API and name, as data."""

from collections.abc import Mapping
from enum import StrEnum
from types import MappingProxyType

import attrs

from wattproof.core.audio_device import Device


class Trust(StrEnum):
    """How far the samples that arrive are those that were sent. The values are stable: they stand in documents."""

    DIRECT = "direct"  # nothing between is known to change them
    DEPENDS = "depends"  # on settings outside this program
    CONVERTED = "converted"  # something between resamples, mixes or processes


@attrs.frozen
class Advice:
    """What stands between the program and a device, and what to choose or set.

    `tried` says whether this program was run on such a system by its makers; else the words are common practice and the
    documentation of PortAudio, not an observation.
    """

    trust: Trust
    between: str
    choose: str
    tried: bool = False


_ALSA_HW = Advice(
    Trust.DIRECT,
    "hw: is the device itself, held by one program at a time, never resampled",
    "a good choice; if it is busy, stop what else plays (a desktop sound server may hold it)",
)
_ALSA_SHARED = Advice(
    Trust.CONVERTED,
    "goes through a converter or a desktop sound server, which may resample and mix without a word",
    "choose the entry of the same device that has hw: in its name",
)
_HOSTS: Mapping[str, Advice] = MappingProxyType({
    "JACK": Advice(
        Trust.DIRECT,
        "the server runs at one rate and hands every program the device's own samples; other programs are mixed in",
        "a good choice; start the server at the rate that you want and let nothing else play",
        tried=True,
    ),
    "ALSA": Advice(
        Trust.DEPENDS,
        "may go through a converter that resamples without a word",
        "choose an entry with hw: in its name",
    ),
    "PulseAudio": Advice(
        Trust.CONVERTED,
        "the desktop's sound server resamples, mixes, and applies its volume; echo cancelling may be on",
        "choose ALSA with hw: in the name, or JACK",
    ),
    "OSS": Advice(Trust.DEPENDS, "the kernel's mixer may resample", "choose ALSA or JACK where there is one"),
    "ASIO": Advice(
        Trust.DIRECT,
        "the maker's own driver, held by one program at a time",
        "a good choice; set the rate and turn direct monitoring off in the driver's own panel",
    ),
    "WASAPI": Advice(
        Trust.DEPENDS,
        "opened in exclusive mode, which bypasses the mixer and its enhancements; input and output are two devices",
        "a good choice where no ASIO driver is; allow exclusive mode in the device's properties, take input and output "
        "of one interface",
    ),
    "DirectSound": Advice(
        Trust.CONVERTED,
        "the mixer resamples, and enhancements may process",
        "choose ASIO or WASAPI",
    ),
    "MME": Advice(Trust.CONVERTED, "the mixer resamples, and enhancements may process", "choose ASIO or WASAPI"),
    "WDM-KS": Advice(
        Trust.DIRECT, "the driver itself, held by one program at a time", "usable; choose ASIO where there is one"
    ),
    "Core Audio": Advice(
        Trust.DEPENDS,
        "the device is set to the rate that is asked for, and refused where it would have to be converted; without "
        "the permission for the microphone the input is exact zeros and no error comes",
        "allow the microphone for your terminal or this program; take input and output of one interface, or an "
        "aggregate device of both with drift correction off",
    ),
})  # fmt: skip
_UNKNOWN = Advice(
    Trust.DEPENDS,
    "nothing is known of this way to the device",
    "check it with a loop from output to input before you rely on it",
)


def advice_on(device: Device) -> Advice:
    """Return what to know of a device before it is chosen."""
    words = device.host_api.casefold()
    if words == "alsa":
        name = device.name.casefold()
        if "(hw:" in name or name.startswith("hw:"):
            return _ALSA_HW
        return _ALSA_SHARED
    return next((advice for host, advice in _HOSTS.items() if host.casefold() in words), _UNKNOWN)
