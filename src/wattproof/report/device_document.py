r"""The list of devices as a JSON document for programs, and as a table for people.

The contract of the document, version 1. Readers ignore keys that they don't know; `version` rises only when a key
changes its meaning or goes. It is ASCII.

    {"wattproof": "devices", "version": 1,
     "devices": [{"choice": "HOST/NAME", "host_api", "name", "inputs", "outputs", "default_rate_hz",
       "rates_hz": [..] | null, "trust": "direct" | "depends" | "converted", "between", "choose", "tried": bool}]}

`choice` is what `--bench` takes. `rates_hz` holds those of 44100, 48000, 88200, 96000, 176400 and 192000 at which the
device really opened when the list was made: none where it opened at none (another program may hold it), null where it
did not answer in time. `trust` says whether something between is likely to change the samples, `between` what, `choose`
what to take or set; `tried` is false where that is common practice and was not observed on such a system.
"""

from collections.abc import Sequence

from wattproof.core.audio_device import Device
from wattproof.core.device_advice import advice_on
from wattproof.report.characters import encodable, printable

NONE_THERE = (
    "No devices. Is the interface plugged in, and its sound system running? On Linux start a JACK server, or look "
    "whether the kernel sees the card (/proc/asound/cards)."
)
CHOOSING = (
    "Choose by --bench 'HOST/NAME'; a word of the host API and a part of the name that only one device has will do. "
    "rate=HZ, in=N,M and out=N,M may stand behind it: --bench 'JACK/loopback rate=48000 in=1,2 out=1'."
)


def device_document(devices: Sequence[Device]) -> dict[str, object]:
    """Return the document as plain values."""
    return {"wattproof": "devices", "version": 1, "devices": [_entry(device) for device in devices]}


def device_lines(devices: Sequence[Device]) -> list[str]:
    """Return the table's lines: for each device its name, channels and rates, what lies between, and what to choose."""
    if not devices:
        return [NONE_THERE]
    lines: list[str] = []
    for device in devices:
        advice = advice_on(device)
        tried = "" if advice.tried else " (not tried by the makers)"
        lines += [
            printable(device.choice),
            f"  {device.inputs} in, {device.outputs} out; {rates_words(device)}",
            f"  {advice.trust}: {advice.between}{tried}",
            f"  {advice.choose}",
            "",
        ]
    return [*lines, CHOOSING]


def rates_words(device: Device) -> str:
    """Return at which rates a device opens, in words."""
    if device.rates_hz is None:
        return "rates unknown: it did not answer in time"
    if not device.rates_hz:
        return "opens at none of the usual rates now; another program may hold it"
    return "opens at " + ", ".join(f"{rate_hz / 1000:g}" for rate_hz in device.rates_hz) + " kHz"


def _entry(device: Device) -> dict[str, object]:
    advice = advice_on(device)
    return {
        "choice": encodable(device.choice),
        "host_api": encodable(device.host_api),
        "name": encodable(device.name),
        "inputs": device.inputs,
        "outputs": device.outputs,
        "default_rate_hz": device.default_rate_hz,
        "rates_hz": None if device.rates_hz is None else list(device.rates_hz),
        "trust": advice.trust.value,
        "between": advice.between,
        "choose": advice.choose,
        "tried": advice.tried,
    }
