"""Any output can be driven and any inputs captured; the bench's own channels are those that were chosen, in order."""

import subprocess
import sys
import threading
from pathlib import Path

import numpy as np
import pytest

from tests.bench.audio_server import DEVICE, AudioServer, missing
from wattproof.app import open_bench
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.portaudio.channels import open_sockets
from wattproof.bench.portaudio.devices import list_devices, with_rates
from wattproof.bench.portaudio.naming import NamingError
from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Samples, Tone

RATE_HZ = 48_000
CHANNELS = 6


@pytest.mark.parametrize(
    ("asked", "there", "columns"),
    [
        (None, 8, [0, 1]),
        (3, 8, [0, 1, 2]),
        ([5], 8, [4]),
        ([3, 4], 8, [2, 3]),
        ([2, 7], 8, [1, 6]),
        ([7, 2], 8, [6, 1]),
        ([2, 1], 2, [1, 0]),
    ],
)
def test_the_columns_are_those_of_the_sockets(asked: int | list[int] | None, there: int, columns: list[int]) -> None:
    opened = open_sockets(asked, there, 2, "inputs")
    assert np.arange(opened.opened)[opened.columns].tolist() == columns
    assert opened.used == len(columns)


@pytest.mark.parametrize("asked", [[1, 1], [1, 2, 3], [], [9], [0], 9])
def test_sockets_that_cannot_be_are_refused(asked: int | list[int]) -> None:
    with pytest.raises(NamingError, match="inputs"):
        open_sockets(asked, 8, 2, "inputs")


def levels(bench: PortaudioBench, output: int) -> list[float]:
    """Return the peak at each of the bench's inputs while one of its outputs sounds."""
    stands = bench.play(Tone(997.0, 0.25, (output,)))
    samples: Samples = bench.capture(stands, RATE_HZ // 10, threading.Event()).samples
    bench.play(Tone(997.0, 0.0, (output,)))
    return [round(float(peak), 3) for peak in np.abs(samples).max(axis=0)]


@pytest.mark.server
def test_a_device_with_many_sockets_drives_and_captures_those_that_are_named(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    lacking = missing()
    if lacking:
        pytest.skip(lacking)
    with AudioServer(tmp_path, RATE_HZ, channels=CHANNELS) as server:
        for name, value in server.environment.items():
            monkeypatch.setenv(name, value)
        bench = open_bench(f"{DEVICE} rate={RATE_HZ} in=5,2 out=2,5")
        assert isinstance(bench, PortaudioBench)
        try:
            assert bench.identity.name == f"{DEVICE} (in 5, 2; out 2, 5)"
            assert (bench.identity.inputs, bench.identity.outputs) == (2, 2)
            assert not bench.round_trip.measured  # output 2 does not come back at input 5
            assert levels(bench, 1) == [0.0, 0.25]
            assert levels(bench, 2) == [0.25, 0.0]
        finally:
            bench.close()
        with pytest.raises(WrongUseError, match="it has 1 to 6, not 7"):
            open_bench(f"{DEVICE} rate={RATE_HZ} in=7")
        listed = {device.name: device for device in with_rates(list_devices())}
        assert listed["loopback"].rates_hz == (48_000.0,)  # a JACK server runs at one rate
        check_a_device_that_comes_later()


def check_a_device_that_comes_later() -> None:
    """Without a restart of this program a new device is listed and opens."""
    assert "wire" not in {device.name for device in list_devices()}
    script = Path(__file__).with_name("wire.py")
    wire = subprocess.Popen([sys.executable, str(script)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    assert wire.stdin is not None
    assert wire.stdout is not None
    try:
        assert wire.stdout.readline() == "ready\n"
        assert "wire" in {device.name for device in list_devices()}
        bench = open_bench(f"JACK/wire rate={RATE_HZ}")
        assert isinstance(bench, PortaudioBench)
        try:
            assert bench.round_trip.measured
        finally:
            bench.close()
    finally:
        wire.stdin.close()
        wire.wait(5)
        wire.stdout.close()


SLOW = """
import time
class PortAudioError(Exception): pass
sockets = {"max_input_channels": 2, "max_output_channels": 2}
devices = [{"name": name, "hostapi": 0, "default_samplerate": 48000.0, **sockets}
           for name in ("first", "hangs", "last")]
query_hostapis = lambda: [{"name": "ALSA"}]
query_devices = lambda: devices
_terminate = lambda: None
class Stream:
    def __init__(self, device, samplerate, **given):
        if devices[device[0]]["name"] == "hangs":
            time.sleep(60)
        if samplerate > 100_000:
            raise PortAudioError("Invalid sample rate", -9997)
    def close(self): pass
"""


def test_a_device_that_hangs_while_its_rates_are_tried_is_passed_over(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "sounddevice.py").write_text(SLOW, encoding="utf-8")
    monkeypatch.syspath_prepend(tmp_path)
    found = with_rates(list_devices(), deadline_s=1.0, start_s=2.0)
    rates = (44_100.0, 48_000.0, 88_200.0, 96_000.0)
    assert [(device.name, device.rates_hz) for device in found] == [("first", rates), ("hangs", None), ("last", rates)]
