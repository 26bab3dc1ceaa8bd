"""Only content proves or clears lost frames: what it proves is refused and counted, what it clears is read."""

import threading

import pytest

from tests.runner.fake_bench import LATENCY, RATE_HZ, FakeBench
from wattproof.bench.simulated import DropOut, SimulatedBench
from wattproof.bench.simulated.dropouts import Fault
from wattproof.core.notes import Note
from wattproof.core.signal import Capture, Gap, Sweep, Tone
from wattproof.core.wording import sentence
from wattproof.procedures.requests import Acquire, Play, Procedure
from wattproof.runner.acquire import Blocks
from wattproof.runner.live import Runner
from wattproof.runner.screen import Ended, Event, Refused

TONE = Tone(997.0, 0.1, (1, 2))
BLOCK = 12_000
AT = 200_000  # frame of an injected fault at 96 kHz: the tone has stood for more than a second


def blocks_on(bench: FakeBench, tone: Tone = TONE) -> tuple[Blocks, list[Note]]:
    refused: list[Note] = []
    blocks = Blocks(bench, threading.Event(), refused.append)
    blocks.tone_stands(bench.play(tone), tone)
    return blocks, refused


def test_a_flag_that_content_clears_costs_no_block() -> None:
    bench = FakeBench()
    bench.gaps = [Gap(30_000, 1_024, "flag")]
    blocks, refused = blocks_on(bench)
    captures = [blocks.acquire(Acquire(BLOCK, BLOCK // 4)) for _ in range(12)]
    assert refused == []
    assert blocks.content.cleared == 1
    assert all(capture.gaps == () for capture in captures)
    firsts = [capture.first_frame for capture in captures]
    assert firsts == [LATENCY + number * BLOCK // 4 for number in range(12)]


def test_a_flag_too_near_to_the_start_of_the_tone_is_not_cleared() -> None:
    bench = FakeBench()
    bench.gaps = [Gap(LATENCY + 1_000, 500, "flag")]
    blocks, refused = blocks_on(bench)
    assert blocks.acquire(Acquire(BLOCK)).first_frame == LATENCY + 1_500
    assert ["flagged a late callback" in sentence(note) for note in refused] == [True]


def test_during_a_sweep_and_in_silence_nothing_is_cleared() -> None:
    for tone in (Sweep(20.0, 0.1, (1,), end_hz=20_000.0, seconds=2.0), Tone(997.0, 0.0)):
        bench = FakeBench()
        bench.gaps = [Gap(30_000, 1_024, "flag")]
        blocks, refused = blocks_on(bench, tone)
        for _ in range(4):
            blocks.acquire(Acquire(BLOCK))
        assert len(refused) == 1
        assert blocks.content.cleared == 0


def run(bench: SimulatedBench, blocks: int) -> tuple[list[Capture], list[Event], Runner]:
    """Take blocks of 250 ms that overlap, through a runner, and return them with what the screen was told."""
    taken: list[Capture] = []
    rate_hz = bench.identity.rate_hz

    def procedure() -> Procedure:
        yield Play(TONE)
        for _ in range(blocks):
            capture = yield Acquire(round(0.25 * rate_hz), round(0.0625 * rate_hz), 0.3)
            assert isinstance(capture, Capture)
            taken.append(capture)

    bench.open()
    runner = Runner(bench, bench.rig, bench.calibration)
    events: list[Event] = []
    try:
        runner.start(procedure())
        pause = threading.Event()
        while not any(isinstance(event, Ended) for event in events):
            events += runner.screen.drain()
            pause.wait(0.01)
    finally:
        runner.close()
    return taken, events, runner


@pytest.mark.parametrize("fault", Fault)
@pytest.mark.parametrize("flagged", [True, False])
@pytest.mark.parametrize("frames", [1, 337, 1_024])
def test_a_block_across_an_injected_fault_is_refused_and_counted(fault: Fault, flagged: bool, frames: int) -> None:  # noqa: FBT001 - a case of the table
    if fault is Fault.REPLACED and not flagged and frames < 48:
        frames = 16  # a single replaced frame is a crackle, whose energy the reading rightly holds
    bench = SimulatedBench(seed=frames, dropouts=(DropOut(AT, frames, fault, flagged),))
    taken, events, runner = run(bench, 28)
    spoilt = frames if fault is not Fault.LOST else 0
    across = [capture for capture in taken if capture.first_frame < AT + spoilt and capture.span.end_frame > AT]
    # a block whose last pieces the fault touches holds too little of it to be seen, or to matter
    edge = round(0.03 * bench.identity.rate_hz)
    deep = [one for one in across if one.span.end_frame > AT + edge and one.first_frame < AT + spoilt - edge]
    assert deep == []
    refused = [event for event in events if isinstance(event, Refused)]
    assert refused
    assert runner.refused() == len(refused)
    assert len(taken) == 28  # and it goes on behind it


def test_a_sound_bench_is_not_suspected() -> None:
    for seed, character in enumerate(("class-d-bridge", "class-ab-crossover", "class-a-single")):
        _, events, runner = run(SimulatedBench(character, seed=seed), 60)
        assert [event for event in events if isinstance(event, Refused)] == []
        assert runner.refused() == 0


def test_the_fake_bench_runs_at_the_rate_that_these_cases_assume() -> None:
    assert RATE_HZ == 48_000.0
