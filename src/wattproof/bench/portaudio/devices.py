"""Lists the sound system's devices afresh, in a process of its own that a dead server cannot keep."""

import attrs

from wattproof.bench.portaudio import process
from wattproof.bench.portaudio.process import Child
from wattproof.core.audio_device import RATES_HZ, Device
from wattproof.core.errors import BenchLostError

LIST_DEADLINE_S = 10.0
RATES_DEADLINE_S = 5.0  # for all rates of one device; one that hangs is left out
CLOSE_S = 1.0


def list_devices(deadline_s: float = LIST_DEADLINE_S) -> tuple[Device, ...]:
    """Return every device there is now: one that came after the start of the program is among them.

    Raises:
        WrongUseError: there is no PortAudio.
        BenchLostError: the sound system does not answer within the deadline.
    """
    answer = process.ask({"do": "list"}, deadline_s)
    if answer is None:
        raise BenchLostError(
            f"the sound system gave no list of devices within {deadline_s:g} s; look whether its server still runs"
        )
    if answer["event"] != "devices":
        raise BenchLostError(f"the sound system gave no list of devices: {answer['why']}; restart its server")
    return tuple(Device(**entry) for entry in answer["devices"])


def with_rates(
    devices: tuple[Device, ...], deadline_s: float = RATES_DEADLINE_S, start_s: float = LIST_DEADLINE_S
) -> tuple[Device, ...]:
    """Return the devices with the rates at which each really opens: every one is opened and closed once a rate.

    A device that does not answer within the deadline (`start_s` more for the first one of a process) keeps None, and
    the next one is tried in a new process.
    """
    found: list[Device] = []
    while len(found) < len(devices):
        told = _told(devices[len(found) :], deadline_s, start_s)
        found += told
        if len(found) < len(devices):
            found.append(devices[len(found)])
    return tuple(found)


def _told(devices: tuple[Device, ...], deadline_s: float, start_s: float) -> list[Device]:
    """Return those of the first devices whose rates came in time."""
    choices = [[device.host_api, device.name, device.inputs, device.outputs] for device in devices]
    child = Child({"do": "rates", "devices": choices, "rates": list(RATES_HZ)})
    told: list[Device] = []
    answered = False
    try:
        for device in devices:
            answer = child.hear(deadline_s if answered else deadline_s + start_s)
            if answer is None or answer["event"] != "rates":
                break
            answered = True
            told.append(attrs.evolve(device, rates_hz=tuple(answer["rates"])))
    finally:
        child.end(CLOSE_S if len(told) == len(devices) else 0.0)
    return told
