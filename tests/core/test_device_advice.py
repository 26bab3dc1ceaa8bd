"""Every way to a device is told with what it does to the samples; what its makers could not try is marked."""

import pytest

from wattproof.core.audio_device import Device
from wattproof.core.device_advice import Trust, advice_on


def device(host_api: str, name: str = "Box") -> Device:
    return Device(host_api, name, 2, 2, 48_000.0)


@pytest.mark.parametrize(
    ("host_api", "name", "trust", "words"),
    [
        ("JACK Audio Connection Kit", "system", Trust.DIRECT, "one rate"),
        ("ALSA", "Box: USB Audio (hw:1,0)", Trust.DIRECT, "one program at a time"),
        ("ALSA", "default", Trust.CONVERTED, "without a word"),
        ("ALSA", "pulse", Trust.CONVERTED, "without a word"),
        ("ALSA", "plughw:1,0", Trust.CONVERTED, "without a word"),
        ("PulseAudio", "Box", Trust.CONVERTED, "resamples"),
        ("Windows WASAPI", "Line (Box)", Trust.DEPENDS, "exclusive mode"),
        ("Windows DirectSound", "Line (Box)", Trust.CONVERTED, "mixer resamples"),
        ("MME", "Line (Box)", Trust.CONVERTED, "enhancements"),
        ("Windows WDM-KS", "Line (Box)", Trust.DIRECT, "driver itself"),
        ("ASIO", "Box ASIO", Trust.DIRECT, "maker's own driver"),
        ("Core Audio", "Box", Trust.DEPENDS, "exact zeros"),
        ("Something New", "Box", Trust.DEPENDS, "nothing is known"),
    ],
)  # fmt: skip
def test_what_lies_between(host_api: str, name: str, trust: Trust, words: str) -> None:
    advice = advice_on(device(host_api, name))
    assert advice.trust is trust
    assert words in advice.between
    assert advice.choose


def test_only_what_was_tried_is_called_tried() -> None:
    hosts = ("JACK Audio Connection Kit", "ALSA", "Windows WASAPI", "ASIO", "Core Audio", "MME", "Something New")
    assert [host for host in hosts if advice_on(device(host)).tried] == ["JACK Audio Connection Kit"]
