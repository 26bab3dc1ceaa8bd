"""How a device is opened so that nothing converts its samples, and at which rates it opens. Runs in the child."""

from typing import Any

from wattproof.bench.portaudio.naming import Entry


def settings_for(sound: Any, host_api: str) -> Any:  # noqa: ANN401 - sounddevice has no types
    """Return the host API's settings that keep converters out of the way; None where it has none.

    Neither could be tried by this program's makers: written from sounddevice's documentation.
    """
    words = host_api.casefold()
    if "wasapi" in words:
        return sound.WasapiSettings(exclusive=True)
    if "core audio" in words:
        return sound.CoreAudioSettings(change_device_parameters=True, fail_if_conversion_required=True)
    return None


def open_rates(sound: Any, entries: list[Entry], device: list[Any], rates: list[float]) -> list[float]:  # noqa: ANN401
    """Return the rates at which a device, given as [host API, name, inputs, outputs], opens; each is tried."""
    host_api, name, inputs, outputs = device
    wanted = (host_api, name, inputs, outputs)
    place = next(
        (
            place
            for place, entry in enumerate(entries)
            if (entry["host_api"], entry["name"], entry["inputs"], entry["outputs"]) == wanted
        ),
        None,
    )
    return [] if place is None else [rate for rate in rates if _opens(sound, entries[place], place, rate)]


def _opens(sound: Any, entry: Entry, place: int, rate_hz: float) -> bool:  # noqa: ANN401 - sounddevice has no types
    inputs, outputs = min(entry["inputs"], 2), min(entry["outputs"], 2)
    settings = settings_for(sound, entry["host_api"])
    common = {"samplerate": rate_hz, "dtype": "float32"}
    try:
        if inputs and outputs:
            both: Any = (place, place), (inputs, outputs), (settings, settings)
            stream = sound.Stream(device=both[0], channels=both[1], extra_settings=both[2], **common)
        elif inputs:
            stream = sound.InputStream(device=place, channels=inputs, extra_settings=settings, **common)
        else:
            stream = sound.OutputStream(device=place, channels=outputs, extra_settings=settings, **common)
        stream.close()
    except (sound.PortAudioError, ValueError):
        return False
    return True
