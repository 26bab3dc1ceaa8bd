"""The real bench against a real audio server: what is played comes back bit for bit, and every change is a ramp."""

import threading
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.bench.audio_server import DEVICE, AudioServer
from tests.bench.expected_tone import CYCLE, RAMP_S, largest_step, ramp, sine
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.portaudio.devices import list_devices
from wattproof.bench.portaudio.marker import Marker
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.signal import Tone

pytestmark = pytest.mark.server

RATE_HZ = 96_000
RAMP = round(RAMP_S * RATE_HZ)
MUTE_FRAMES = round(0.1 * RATE_HZ)  # mute silences within 0.1 s
LOW, HIGH = 1_361, 4_097  # 996.8 Hz and 3.0 kHz, in steps of rate / CYCLE


def hertz(steps: int) -> float:
    return steps * RATE_HZ / CYCLE


def take(bench: PortaudioBench, first_frame: int, frames: int) -> NDArray[np.float64]:
    return bench.capture(first_frame, frames, threading.Event()).samples


def expected_record(begins: list[int], frames: int) -> NDArray[np.float64]:
    """LOW at 0.5 on both outputs; HIGH at 0.25 on output 2; HIGH at 0.125 on output 2; silence."""
    low_on, high_on, softer, off = begins
    at = np.zeros((4, frames))  # the weight of each step's takeover
    for row, begin in enumerate(begins):
        at[row, begin : begin + RAMP] = ramp(RAMP)
        at[row, begin + RAMP :] = 1.0
    low = sine(LOW, -low_on, frames) * at[0] * (1.0 - at[1])
    high = sine(HIGH, -high_on, frames)
    second = high * 0.25 * at[1] * (1.0 - at[2]) + high * 0.125 * at[2] * (1.0 - at[3])
    assert low_on + RAMP <= high_on
    assert softer + RAMP <= off
    return np.stack([0.5 * low, 0.5 * low + second], axis=1)


@pytest.mark.usefixtures("audio_server")
def test_what_is_played_comes_back_bit_for_bit_with_every_ramp() -> None:
    bench = PortaudioBench(DEVICE, RATE_HZ, marker=Marker())
    bench.open()
    try:
        tones = [
            Tone(hertz(LOW), 0.5, (1, 2)),
            Tone(hertz(HIGH), 0.25, (2,)),
            Tone(hertz(HIGH), 0.125, (2,)),
            Tone(hertz(HIGH), 0.0, (2,)),
        ]
        stands = []
        for tone, seconds in zip(tones, (2.0, 1.0, 0.5, 0.0), strict=True):
            stands.append(bench.play(tone))
            take(bench, stands[-1], max(1, round(seconds * RATE_HZ)))
        first = stands[0] - RAMP - 1_000
        record = take(bench, first, stands[-1] + 5_000 - first)
    finally:
        bench.close()
    expected = expected_record([frame - RAMP - first for frame in stands], len(record)).astype(np.float32)
    assert len(record) > 3.5 * RATE_HZ
    np.testing.assert_array_equal(record.astype(np.float32), expected)
    np.testing.assert_array_equal(record, record.astype(np.float32))  # nothing was lost on the way to float64
    steps = np.abs(np.diff(record, axis=0)).max(axis=0)
    assert steps[0] <= largest_step(0.5, hertz(LOW), RATE_HZ)
    assert steps[1] <= largest_step(0.5, hertz(LOW), RATE_HZ) + largest_step(0.25, hertz(HIGH), RATE_HZ)


def test_the_marker_measures_the_round_trip_exactly(audio_server: AudioServer) -> None:
    bench = PortaudioBench(DEVICE, RATE_HZ, marker=Marker(level_fs=0.001, output=2, input=2))
    bench.open()
    try:
        trip = bench.round_trip
        stands = bench.play(Tone(hertz(LOW), 0.5, (1,)))
        around = take(bench, stands - RAMP - 10, 20)[:, 0]
    finally:
        bench.close()
    assert trip.measured
    assert trip.frames == audio_server.period  # with blocksize 0 the loopback's delay is one period
    np.testing.assert_array_equal(around[:11], 0.0)  # the tone's own first sample is sin 0
    assert np.all(around[11:] != 0.0)


@pytest.mark.usefixtures("audio_server")
def test_mute_from_any_thread_silences_within_a_tenth_of_a_second_by_a_ramp() -> None:
    bench = PortaudioBench(DEVICE, RATE_HZ)
    bench.open()
    try:
        stands = bench.play(Tone(hertz(LOW), 0.5, (1, 2)))
        take(bench, stands, 1_000)
        called = bench.next_frame
        thread = threading.Thread(target=bench.mute)
        thread.start()
        thread.join()
        record = take(bench, called - 1_000, 1_000 + 2 * MUTE_FRAMES)
        muted = take(bench, bench.play(Tone(hertz(LOW), 0.5, (1, 2))), 1_000)
        bench.release()
        released = bench.next_frame
        still_silent = take(bench, released, 10_000)
        again = take(bench, bench.play(Tone(hertz(LOW), 0.5, (1, 2))), 1_000)
    finally:
        bench.close()
    assert np.abs(record[:1_000]).max() > 0.49
    np.testing.assert_array_equal(record[1_000 + MUTE_FRAMES :], 0.0)
    assert np.abs(np.diff(record, axis=0)).max() <= largest_step(0.5, hertz(LOW), RATE_HZ)
    np.testing.assert_array_equal(muted, 0.0)  # while muted nothing sounds
    np.testing.assert_array_equal(still_silent, 0.0)  # and after the release not before the next play
    assert np.abs(again).max() > 0.49


@pytest.mark.usefixtures("audio_server")
def test_a_capture_reports_overloads_and_can_be_stopped() -> None:
    bench = PortaudioBench(DEVICE, RATE_HZ)
    bench.open()
    try:
        stands = bench.play(Tone(50.0, 1.0, (2,)))
        capture = bench.capture(stands, 9_600, threading.Event())
        stop = threading.Event()
        threading.Timer(0.2, stop.set).start()
        with pytest.raises(StoppedError, match="stopped"):
            bench.capture(bench.next_frame, 60 * RATE_HZ, stop)
        with pytest.raises(WrongUseError, match="half the rate"):
            bench.play(Tone(48_000.0, 0.1))
        with pytest.raises(WrongUseError, match="no output 3"):
            bench.play(Tone(1_000.0, 0.1, (3,)))
    finally:
        bench.close()
    assert {overload.channel for overload in capture.overloads} == {2}
    assert len(capture.overloads) == 10  # 5 periods of 50 Hz in 0.1 s, a run at each peak
    with pytest.raises(BenchLostError, match="not open"):
        bench.capture(0, 1, threading.Event())


@pytest.mark.usefixtures("audio_server")
def test_devices_are_listed_and_chosen_by_host_api_and_name() -> None:
    there = {device.name: device for device in list_devices()}
    assert there["loopback"].host_api == "JACK Audio Connection Kit"
    assert (there["loopback"].inputs, there["loopback"].outputs) == (2, 2)
    assert there["loopback"].default_rate_hz == RATE_HZ
    bench = PortaudioBench(there["loopback"].choice, RATE_HZ, inputs=1, outputs=1)
    bench.open()
    try:
        assert (bench.identity.inputs, bench.identity.outputs) == (1, 1)
        assert bench.identity.real
        assert take(bench, bench.next_frame, 100).shape == (100, 1)
    finally:
        bench.close()


@pytest.mark.usefixtures("audio_server")
@pytest.mark.parametrize(
    ("device", "rate_hz", "inputs", "words"),
    [
        ("JACK/no such thing", RATE_HZ, None, "no device .*loopback"),
        ("loopback", RATE_HZ, None, "HOST/NAME"),
        (DEVICE, 44_100, None, "44100 Hz"),
        (DEVICE, RATE_HZ, 3, "inputs: it has 2, not 3"),
    ],
)
def test_what_a_device_refuses_is_said_in_one_line(device: str, rate_hz: int, inputs: int | None, words: str) -> None:
    bench = PortaudioBench(device, rate_hz, inputs=inputs)
    with pytest.raises(WrongUseError, match=words) as refused:
        bench.open()
    assert "\n" not in str(refused.value)


@pytest.mark.usefixtures("audio_server")
def test_the_shared_memory_has_no_name_that_could_be_left_behind() -> None:
    bench = PortaudioBench(DEVICE, RATE_HZ)
    bench.open()
    try:
        maps = Path(f"/proc/{bench.child_pid}/maps").read_text(encoding="utf-8")
    finally:
        bench.close()
    ours = [line for line in maps.splitlines() if "/wp-" in line]
    assert ours
    assert all(line.endswith("(deleted)") for line in ours)
