"""The callback, called by hand: it copies by absolute frame, and ends by ramp, silent block and stop."""

from collections.abc import Iterator

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.bench.expected_tone import largest_step
from wattproof.bench.portaudio import layout, ring
from wattproof.bench.portaudio.engine import BEAT_LIMIT_S, HELD_S, Engine
from wattproof.bench.portaudio.layout import Memory, Shape
from wattproof.bench.portaudio.synth import CYCLE, RAMP_S

RATE_HZ = 48_000
RAMP = round(RAMP_S * RATE_HZ)
FRAMES = 300


class Times:
    """Times as PortAudio hands them over."""

    inputBufferAdcTime = 1.0  # noqa: N815 - PortAudio's own names
    outputBufferDacTime = 2.0  # noqa: N815 - likewise
    currentTime = 3.0  # noqa: N815 - likewise


class Clock:
    """A clock that is told the time."""

    def __init__(self) -> None:
        self.now = 100.0

    def __call__(self) -> float:
        return self.now


class Stream:
    """An engine between arrays of ours; its input is the number of the frame, on input 2 negative."""

    def __init__(self, memory: Memory) -> None:
        self.memory = memory
        self.words = memory.words
        self.clock = Clock()
        self.engine = Engine(memory, RATE_HZ, (2, 2), self.clock)
        self.frame = 0
        self.ended = False

    def call(self, frames: int = FRAMES, flags: int = 0, *, beat: bool = True) -> NDArray[np.float32]:
        """Call back once, a little later than the last time."""
        assert not self.ended
        self.words[layout.BEAT] += beat
        at = np.arange(self.frame, self.frame + frames, dtype=np.float32)
        out = np.full((frames, 2), np.nan, dtype=np.float32)
        self.ended = self.engine.run(np.stack([at, -at], axis=1), out, Times(), flags)
        self.frame += frames
        self.clock.now += frames / RATE_HZ
        return out

    def play(self, gain: float = 0.5) -> None:
        """Hand over a command as the bench does."""
        self.memory.gains[0] = self.memory.gains[1] = gain
        self.words[layout.KIND] = layout.TONE
        self.words[layout.STEP] = CYCLE // 50
        self.words[layout.COMMAND] += 1


@pytest.fixture
def stream() -> Iterator[Stream]:
    memory = layout.create(Shape(4_096, 2, 2))
    memory.unlink()
    stream = Stream(memory)
    yield stream
    del stream.engine
    memory.release()


def sound(stream: Stream) -> None:
    stream.play()
    blocks = [stream.call() for _ in range(5)]
    assert np.abs(blocks[-1]).max() == pytest.approx(0.5, rel=0.0, abs=0.01)


def silence_and_end(stream: Stream) -> None:
    """Within a ramp the tone is down; the block after that is silent and the last."""
    blocks = []
    while not stream.ended:
        blocks.append(stream.call(beat=False))
        assert len(blocks) < 10
    down = np.concatenate(blocks)
    np.testing.assert_array_equal(down[RAMP:], 0.0)
    assert np.abs(down[:RAMP]).max() > 0.4
    np.testing.assert_array_equal(blocks[-1], 0.0)
    assert len(blocks) == -(-RAMP // FRAMES) + 1


def test_frames_are_found_by_their_number_over_the_ring_s_end(stream: Stream) -> None:
    for frames in (300, 1, 700, 4_000, 37, 2_100):
        stream.call(frames)
    into = np.zeros((2_000, 2))
    assert ring.read(stream.memory, 4_500, into) == 2_000
    np.testing.assert_array_equal(into[:, 0], np.arange(4_500, 6_500))
    np.testing.assert_array_equal(into[:, 1], -np.arange(4_500, 6_500))
    assert ring.read(stream.memory, 7_000, into) == 138  # what is there of it
    assert ring.read(stream.memory, 9_000, into) == 0  # still to come


def test_frames_that_were_written_over_are_refused(stream: Stream) -> None:
    for _ in range(20):
        stream.call()
    oldest = 6_000 - 4_096 + 4_096 // layout.MARGIN
    ring.read(stream.memory, oldest, np.zeros((10, 2)))
    for frame in (oldest - 1, -1):
        with pytest.raises(ring.OverwrittenError, match=f"{oldest}"):
            ring.read(stream.memory, frame, np.zeros((10, 2)))


def test_each_callback_is_logged(stream: Stream) -> None:
    stream.call(300)
    stream.call(170, layout.INPUT_OVERFLOW + layout.OUTPUT_UNDERFLOW)
    assert stream.words[layout.ROWS] == 2
    assert stream.memory.log[: 2 * layout.ROW].tolist() == [0, 300, 0, 0, 300, 170, 6, 0]
    assert stream.memory.times[: layout.ROW].tolist() == [100.0, 1.0, 2.0, 3.0]


def test_a_command_is_answered_with_the_frame_of_its_ramp(stream: Stream) -> None:
    stream.call()
    stream.play()
    stream.call()
    assert (stream.words[layout.ANSWERED], stream.words[layout.ANSWER_FRAME]) == (1, FRAMES)
    stream.play(0.1)
    stream.call()  # the first ramp of 480 frames ends within this block
    assert (stream.words[layout.ANSWERED], stream.words[layout.ANSWER_FRAME]) == (2, FRAMES + RAMP)


def test_without_a_beat_for_0_3_s_it_ramps_down_and_ends(stream: Stream) -> None:
    sound(stream)
    while stream.clock.now < 100.0 + 5 * FRAMES / RATE_HZ + BEAT_LIMIT_S - FRAMES / RATE_HZ:
        assert np.abs(stream.call(beat=False)).max() > 0.49
    silence_and_end(stream)
    assert stream.engine.why == "beat"


def test_a_callback_that_was_held_for_long_does_not_take_the_parent_for_dead(stream: Stream) -> None:
    sound(stream)
    stream.clock.now += 0.9 * HELD_S
    assert np.abs(stream.call()).max() > 0.49  # the parent has beaten meanwhile
    assert stream.engine.why == ""


def test_after_a_suspended_machine_wakes_the_tone_ends_by_a_ramp(stream: Stream) -> None:
    sound(stream)
    stream.clock.now += 3.0
    silence_and_end(stream)
    assert stream.engine.why == "held"


@pytest.mark.parametrize("way", ["asked", "term"])
def test_every_end_is_a_ramp_a_silent_block_and_the_stop(stream: Stream, way: str) -> None:
    sound(stream)
    if way == "asked":
        stream.words[layout.ENDING] = 1
    else:
        stream.engine.end(way)
    silence_and_end(stream)
    assert stream.engine.why == way


def test_a_fault_in_the_callback_ends_by_a_ramp_from_the_same_sample(stream: Stream) -> None:
    sound(stream)
    blocks, last = [stream.call()], False
    three_inputs = np.zeros((FRAMES, 3), dtype=np.float32)  # cannot be kept
    while not last:
        out = np.full((FRAMES, 2), np.nan, dtype=np.float32)
        with pytest.raises(ValueError, match="broadcast"):
            stream.engine.run(three_inputs, out, Times(), 0)
        last = stream.engine.run_down(out, "failed")
        blocks.append(out)
    whole = np.concatenate(blocks).astype(np.float64)
    assert np.abs(np.diff(whole, axis=0)).max() <= largest_step(0.5, RATE_HZ / 50, RATE_HZ)
    np.testing.assert_array_equal(whole[FRAMES + RAMP :], 0.0)
    np.testing.assert_array_equal(blocks[-1], 0.0)
    assert stream.engine.why == "failed"


def test_a_mute_between_two_callbacks_is_not_missed(stream: Stream) -> None:
    sound(stream)
    stream.words[layout.MUTES] += 1  # latched and released before the callback came
    down = np.concatenate([stream.call(), stream.call()])
    np.testing.assert_array_equal(down[RAMP:], 0.0)
    sound(stream)  # the latch is off


def test_while_latched_a_command_is_answered_but_not_heard(stream: Stream) -> None:
    sound(stream)
    stream.words[layout.LATCHED] = 1
    stream.words[layout.MUTES] += 1
    stream.play()
    down = np.concatenate([stream.call() for _ in range(5)])
    np.testing.assert_array_equal(down[RAMP:], 0.0)
    assert stream.words[layout.ANSWERED] == 2
    stream.words[layout.LATCHED] = 0
    np.testing.assert_array_equal(stream.call(), 0.0)  # nothing sounds until the next command
