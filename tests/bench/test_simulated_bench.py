"""The simulated bench keeps the protocol's promises: the same samples, ramps, the mute latch, pace, drop-outs."""

import subprocess
import sys
import threading
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from wattproof.bench.protocol import Bench
from wattproof.bench.simulated import CHARACTERS, OPEN_OHM, DropOut, Fault, Interface, SimulatedBench
from wattproof.bench.simulated.characters import character_named
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.signal import Capture, Samples, Tone

RATE_HZ = 96_000
STOP = threading.Event()
TONE = Tone(997.0, 0.25, (1, 2))


def opened(**given: Any) -> SimulatedBench:  # noqa: ANN401 - the constructor's own options, passed on
    bench = SimulatedBench(**given)
    bench.open()
    return bench


def blocks(bench: SimulatedBench, first_frame: int, end_frame: int, size: int) -> Samples:
    parts = [
        bench.capture(start, min(size, end_frame - start), STOP).samples
        for start in range(first_frame, end_frame, size)
    ]
    return np.concatenate(parts)


def rms(samples: Samples) -> float:
    return float(np.sqrt(np.mean(samples**2)))


class ToldClock:
    """A clock that is told the time, and an event whose waiting makes it pass."""

    def __init__(self) -> None:
        self.now_s = 100.0
        self.waited_s: list[float] = []

    def __call__(self) -> float:
        return self.now_s

    def event(self, set_after_s: float = float("inf")) -> threading.Event:
        clock = self

        class Passing(threading.Event):
            def wait(self, timeout: float | None = None) -> bool:
                assert timeout is not None
                clock.waited_s.append(timeout)
                clock.now_s += timeout + 1e-5
                if clock.now_s - 100.0 > set_after_s:
                    self.set()
                return self.is_set()

        return Passing()


def test_it_is_a_bench() -> None:
    bench: Bench = SimulatedBench()
    assert bench.identity.name == "simulated:class-d-bridge"
    assert not bench.identity.real


@pytest.mark.parametrize("size", [1, 700, 4096])
def test_samples_do_not_depend_on_how_blocks_are_cut(size: int) -> None:
    def session(bench: SimulatedBench, size: int) -> Samples:
        parts = [blocks(bench, 0, 1500, size)]
        bench.turn("knob", -3.0)
        bench.play(TONE)
        parts.append(blocks(bench, 1500, 9000, size))
        bench.turn("load", 4.0)
        bench.play(Tone(1500.0, 0.2, (2,)))
        parts.append(blocks(bench, 9000, 14_000, size))
        bench.mute()
        parts.append(blocks(bench, 14_000, 18_000, size))
        return np.concatenate(parts)

    whole = session(opened(seed=7), 100_000)
    assert np.array_equal(session(opened(seed=7), size), whole)
    assert not np.array_equal(session(opened(seed=8), size), whole)


def test_overlapping_blocks_are_the_same_frames() -> None:
    bench = opened()
    bench.play(TONE)
    first = bench.capture(0, 24_000, STOP)
    second = bench.capture(12_000, 24_000, STOP)
    assert np.array_equal(first.samples[12_000:], second.samples[:12_000])


def test_five_seconds_are_kept_and_older_frames_are_refused_clearly() -> None:
    bench = opened()
    bench.capture(7 * RATE_HZ - 10, 10, STOP)
    bench.capture(2 * RATE_HZ, 100, STOP)
    with pytest.raises(BenchLostError, match=r"frame 0 is no longer kept; the history begins at frame \d+"):
        bench.capture(0, 100, STOP)


def test_a_block_longer_than_the_history_is_captured() -> None:
    bench = opened()
    assert bench.capture(0, 8 * RATE_HZ, STOP).frames == 8 * RATE_HZ


def test_the_tone_stands_from_the_frame_that_play_returns() -> None:
    bench = opened()
    bench.capture(0, 1000, STOP)
    stands = bench.play(TONE)
    silent_until = 1000 + Interface().latency_frames - 128
    samples = bench.capture(0, stands + 4 * RATE_HZ, STOP).samples[:, 0]
    frames = np.arange(96_000)
    sine = np.exp(-2j * np.pi * 997.0 / RATE_HZ * frames)

    def level(first_frame: int) -> float:
        part = samples[first_frame : first_frame + 9600]
        design = np.column_stack([sine[:9600].real, sine[:9600].imag, np.ones(9600), frames[:9600]])
        found = np.linalg.lstsq(design, part, rcond=None)[0]
        return float(np.hypot(found[0], found[1]))

    assert rms(samples[:silent_until]) < 5e-4  # the switching residue stands at 2e-4, the tone comes to 5e-2
    assert level(stands) == pytest.approx(level(stands + 3 * RATE_HZ), rel=1e-5, abs=0.0)  # noise at -85 dB, averaged


def test_a_change_of_level_or_frequency_is_a_ramp() -> None:
    bench = opened()
    bench.turn("knob", -6.0)
    bench.play(Tone(100.0, 0.05, (1, 2)))
    bench.capture(0, 48_000, STOP)
    bench.play(Tone(100.0, 0.2, (1, 2)))
    bench.capture(0, 60_000, STOP)
    bench.play(Tone(150.0, 0.2, (1, 2)))
    samples = bench.capture(0, 96_000, STOP).samples[:, 0]
    steps = np.abs(np.diff(samples))
    steepest = 2.0 * np.pi * 150.0 / RATE_HZ * np.abs(samples[80_000:]).max()
    ramp = np.pi / 2.0 / (0.010 * RATE_HZ) * 2.0 * np.abs(samples).max()
    assert steps.max() < steepest + ramp + 1e-3  # no more than the tone's own slope, the ramp's and the noise


def test_only_the_outputs_of_the_tone_sound() -> None:
    bench = opened()
    stands = bench.play(Tone(997.0, 0.25, (2,)))
    samples = bench.capture(stands, 9600, STOP).samples
    assert rms(samples[:, 1]) > 1e-2
    assert rms(samples[:, 0]) < 1e-3


def test_mute_is_silence_within_a_tenth_of_a_second_and_latches() -> None:
    bench = opened(interface=Interface(latency_frames=256))
    stands = bench.play(TONE)
    bench.capture(0, stands + 9600, STOP)
    muted_at = bench.next_frame
    bench.mute()
    bench.play(TONE)
    after = bench.capture(muted_at, 20_000, STOP).samples
    assert rms(after[9600:] - after[9600:].mean(axis=0)) < 1e-3
    bench.release()
    assert rms(bench.capture(muted_at + 20_000, 9600, STOP).samples) < 1e-3
    stands = bench.play(TONE)
    assert rms(bench.capture(stands, 9600, STOP).samples) > 1e-2


def test_mute_play_and_turn_come_from_any_thread_while_another_captures() -> None:
    bench = opened()
    failures: list[BaseException] = []

    def busy(action: Callable[[], object]) -> None:
        try:
            for _ in range(200):
                action()
        except BaseException as error:  # noqa: BLE001 - whatever it is, the test must see it
            failures.append(error)

    actions = (
        lambda: bench.play(TONE),
        bench.mute,
        bench.release,
        lambda: bench.turn("knob", -10.0),
        lambda: bench.capture(bench.next_frame, 500, STOP),
    )
    threads = [threading.Thread(target=busy, args=(action,)) for action in actions]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(timeout=60.0)
    assert not failures
    assert not any(thread.is_alive() for thread in threads)


def test_a_clock_offset_shifts_the_frequency() -> None:
    rate_hz = 48_000
    bench = opened(rate_hz=float(rate_hz), interface=Interface(clock_offset_ppm=1000.0))
    stands = bench.play(Tone(1000.0, 0.25, (1, 2)))
    samples = bench.capture(stands + rate_hz, rate_hz, STOP).samples[:, 0]
    assert int(np.abs(np.fft.rfft(samples)).argmax()) == 1001


def test_beyond_full_scale_the_codes_stand_at_the_rail_and_are_flagged() -> None:
    bench = opened(interface=Interface(attenuator_ratio=2.0))
    bench.turn("knob", 0.0)
    stands = bench.play(TONE)
    block: Capture = bench.capture(stands, 9600, STOP)
    assert block.samples.max() == 1.0 - 2.0**-23
    assert block.samples.min() == -1.0
    per_channel = [[run for run in block.overloads if run.channel == channel] for channel in (1, 2)]
    assert all(190 <= len(runs) <= 210 for runs in per_channel)  # two in each of the 99.7 cycles
    assert all(stands <= run.first_frame and run.first_frame + run.frames <= stands + 9600 for run in block.overloads)


@pytest.mark.parametrize("character", CHARACTERS)
def test_without_overload_nothing_is_flagged(character: str) -> None:
    bench = opened(character=character)
    bench.turn("knob", 0.0)
    stands = bench.play(TONE)
    assert bench.capture(stands, 9600, STOP).overloads == ()


@pytest.mark.parametrize("fault", list(Fault))
def test_an_injected_drop_out_is_told_and_seen(fault: Fault) -> None:
    at = 60_000
    clean = opened()
    faulty = opened(dropouts=(DropOut(at, 337, fault),))
    for bench in (clean, faulty):
        bench.play(TONE)
    expected = clean.capture(0, 96_000, STOP).samples
    block = faulty.capture(0, 96_000, STOP)
    assert np.array_equal(block.samples[:at], expected[:at])
    assert not np.array_equal(block.samples[at:], expected[at:])
    assert len(block.gaps) == 1
    assert faulty.capture(0, at - 1, STOP).gaps == ()
    shift = {Fault.LOST: -337, Fault.REPEATED: 337, Fault.REPLACED: 0}[fault]
    assert np.array_equal(block.samples[at + 400 : 90_000], expected[at + 400 - shift : 90_000 - shift])


def test_a_vanished_device_is_lost() -> None:
    bench = opened(lost_at_frame=5000)
    bench.capture(0, 5000, STOP)
    with pytest.raises(BenchLostError, match="vanished at frame 5000"):
        bench.capture(5000, 1, STOP)


def test_a_set_stop_event_ends_the_capture() -> None:
    stop = threading.Event()
    stop.set()
    with pytest.raises(StoppedError):
        opened().capture(0, 100, stop)


def test_a_closed_bench_is_lost_and_an_unopened_one_too() -> None:
    with pytest.raises(BenchLostError, match="not open"):
        SimulatedBench().capture(0, 1, STOP)
    bench = opened()
    bench.close()
    bench.close()
    with pytest.raises(BenchLostError, match="closed"):
        bench.capture(0, 1, STOP)
    with pytest.raises(BenchLostError, match="closed"):
        bench.play(TONE)


def test_it_is_opened_once() -> None:
    bench = opened()
    with pytest.raises(WrongUseError, match="opened before"):
        bench.open()


def test_in_real_pace_frames_come_with_the_clock_and_no_sooner() -> None:
    clock = ToldClock()
    bench = opened(pace="real", clock=clock)
    stop = clock.event()
    bench.capture(0, 9600, stop)
    assert 0.1 <= clock.now_s - 100.0 < 0.1 + 0.012  # the block, and the rest of a chunk of 10.7 ms
    for index in range(1, 50):
        bench.capture(index * 4800, 9600, stop)
    assert 2.5 <= clock.now_s - 100.0 < 2.5 + 0.1 + 0.012  # absolute deadlines: nothing adds up
    assert abs(bench.next_frame - (clock.now_s - 100.0) * RATE_HZ) <= 1
    assert min(clock.waited_s) > 0.0
    assert len(clock.waited_s) < 1000


def test_in_real_pace_a_stop_ends_the_wait() -> None:
    clock = ToldClock()
    bench = opened(pace="real", clock=clock)
    with pytest.raises(StoppedError):
        bench.capture(0, 96_000, clock.event(set_after_s=0.3))
    assert clock.now_s - 100.0 < 0.6


def test_in_real_pace_an_action_takes_effect_now_although_nobody_captures() -> None:
    clock = ToldClock()
    bench = opened(pace="real", clock=clock)
    bench.capture(0, 4800, clock.event())
    clock.now_s += 60.0
    before = bench.next_frame
    stands = bench.play(TONE)
    assert before < stands < before + 5000
    block = bench.capture(stands, 9600, clock.event())
    assert rms(block.samples) > 1e-2
    silent = bench.capture(stands - 9600, 4800, clock.event())
    assert rms(silent.samples) < 1e-3


def test_real_and_free_pace_give_the_same_samples() -> None:
    clock = ToldClock()
    real, free = opened(pace="real", clock=clock), opened()
    for bench in (real, free):
        bench.play(TONE)
    assert np.array_equal(real.capture(0, 20_000, clock.event()).samples, free.capture(0, 20_000, STOP).samples)


def test_the_controls_are_knob_load_and_supply_and_follow() -> None:
    bench = opened()
    bench.turn("knob", -12.0)
    bench.turn("load", OPEN_OHM)
    bench.turn("supply", 14.0)
    assert {control.name: control.value for control in bench.controls} == {
        "knob": -12.0,
        "load": OPEN_OHM,
        "supply": 14.0,
    }
    assert bench.rig.wirings[0].load.ohm == OPEN_OHM


@pytest.mark.parametrize(
    ("name", "value", "said"),
    [
        ("volume", 0.0, "no control 'volume'; it has knob, load, supply"),
        ("knob", 1.0, "knob is 1 dB; it must lie from -60 to 0 dB"),
        ("knob", float("nan"), "knob is nan dB"),
        ("load", 6.0, "load is 6 Ω; it can be 4, 8, 1e"),
    ],
)
def test_a_wrong_turn_is_refused_in_one_line(name: str, value: float, said: str) -> None:
    with pytest.raises(WrongUseError, match=said):
        opened().turn(name, value)


def test_a_hand_turns_the_knob_steadily() -> None:
    bench = opened()
    bench.turn("knob", -40.0)
    bench.capture(0, 48_000, STOP)
    bench.glide("knob", -20.0, 10.0)
    bench.capture(48_000, RATE_HZ, STOP)
    assert bench.controls[0].value == pytest.approx(-30.0, rel=0.0, abs=0.2)  # a chunk of 10.7 ms at 10 dB/s
    bench.capture(144_000, 2 * RATE_HZ, STOP)
    assert bench.controls[0].value == -20.0
    with pytest.raises(WrongUseError, match="only the knob glides"):
        bench.glide("supply", 10.0, 1.0)


def test_a_tone_that_it_cannot_sound_is_refused() -> None:
    with pytest.raises(WrongUseError, match="has 2"):
        opened().play(Tone(997.0, 0.1, (3,)))
    with pytest.raises(WrongUseError, match="half the rate"):
        opened().play(Tone(48_000.0, 0.1))


def test_an_unknown_amplifier_is_refused_with_those_that_there_are() -> None:
    with pytest.raises(WrongUseError, match="'tube'; there are class-d-bridge, class-ab-crossover, class-a-single"):
        SimulatedBench("tube")
    assert character_named("simulated").name == CHARACTERS[0]
    assert character_named("simulated:class-a-single").name == "class-a-single"


def test_it_declares_its_own_scales_and_wiring() -> None:
    bench = SimulatedBench("class-d-bridge")
    assert bench.calibration.inputs[0].origin == "declared by the simulator"
    scale = bench.calibration.input_vrms(1)
    assert scale is not None
    assert scale.value == 2.0
    assert [wiring.bridge_tied for wiring in bench.rig.wirings] == [True, True]
    assert not SimulatedBench("class-a-single").rig.wirings[0].bridge_tied


def test_it_starts_without_the_slow_libraries() -> None:
    code = (
        "import sys, wattproof.bench.simulated;"
        "sys.exit(any(name.split('.')[0] in {'scipy', 'soundfile', 'sounddevice'} for name in sys.modules))"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
