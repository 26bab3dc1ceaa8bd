"""Whatever a person does in whatever order: nothing sounds above the limit, and after a stop there is silence."""

import contextlib

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.procedures.fake_reader import FakeReader
from tests.runner.fake_bench import FULL_SCALE_VRMS, RATE_HZ, FakeBench
from wattproof.core.errors import WrongUseError
from wattproof.core.reading import ReadingSettings
from wattproof.core.rig import Limits, Rig, Wiring
from wattproof.core.run import Ending
from wattproof.core.signal import Tone
from wattproof.procedures.requests import Acquire, Play, Procedure
from wattproof.procedures.watch import Watch, watch
from wattproof.runner.live import Runner
from wattproof.runner.screen import Ended

_ROUNDING = 1.0 + 1e-6  # of the product level times full scale, far below what matters

Action = tuple[str, float]
wishes = st.tuples(st.just("level"), st.floats(0.0, 1.0))
limits = st.tuples(st.just("limit"), st.floats(0.0, 2.0))
others = st.tuples(st.sampled_from(["on", "off", "mute", "stop", "start", "frequency"]), st.just(0.0))
stubborn = st.tuples(st.just("play whatever is wished"), st.floats(0.0, 1.0))
frames = st.tuples(st.just("frames"), st.integers(1, 30_000).map(float))
actions = st.lists(st.one_of(wishes, limits, others, stubborn, frames, frames), min_size=1, max_size=25)


class Table:
    """A watch on a fake bench, whose every sound is held against the limit at the moment it begins."""

    def __init__(self) -> None:
        self.bench = FakeBench(auto=False)
        self.bench.on_sound = self._look
        self.runner = Runner(
            self.bench,
            Rig(wirings=(Wiring(), Wiring(output=2, input=2)), limits=Limits(drive_vrms=1.0)),
            self.bench.calibration,
        )
        self.too_loud: list[Tone] = []
        self.runner.wish(tone_on=True, frequency_hz=997.0, level_fs=0.25)
        self.runner.start(self._watch())

    def act(self, action: Action) -> None:
        """Do one thing as a person would; a refusal is read and shrugged off."""
        name, value = action
        with contextlib.suppress(WrongUseError):
            self._act(name, value)

    def assert_within_limit(self) -> None:
        sounding = self.bench.sounding
        assert sounding is None or not self._is_too_loud(sounding)
        assert self.too_loud == []

    def _act(self, name: str, value: float) -> None:
        match name:
            case "level":
                self.runner.wish(level_fs=value)
            case "on" | "off":
                self.runner.wish(tone_on=name == "on")
                assert name == "on" or self.bench.sounding is None
            case "frequency":
                self.runner.wish(frequency_hz=60.0 if self.runner.wishes.frequency_hz > 100.0 else 997.0)
            case "limit":
                self.runner.set_drive_limit_vrms(value)
            case "mute":
                self.runner.mute()
                assert self.bench.sounding is None
            case "stop":
                self.runner.stop()
                assert self.bench.sounding is None
                assert not self.runner.running
            case "start":
                self.runner.start(self._watch())
            case "play whatever is wished":
                self.runner.stop()
                self.runner.start(_play(value, self.runner.outputs))
            case _:
                self.bench.give(round(value))
                self.bench.wait_until_asked(lambda: not self.runner.running)

    def _watch(self) -> Procedure:
        reader = FakeReader(RATE_HZ, (ReadingSettings(), ReadingSettings()))
        return watch(Watch(), reader, RATE_HZ, self.runner.outputs)

    def _look(self, tone: Tone) -> None:
        if self._is_too_loud(tone):
            self.too_loud.append(tone)

    def _is_too_loud(self, tone: Tone) -> bool:
        return tone.level_fs * FULL_SCALE_VRMS > self.runner.limit.vrms * _ROUNDING


def _play(level_fs: float, outputs: tuple[int, ...]) -> Procedure:
    yield Play(Tone(997.0, level_fs / 2.0, outputs))
    yield Acquire(4800)
    yield Play(Tone(997.0, level_fs, outputs))
    while True:
        yield Acquire(4800)


@settings(max_examples=80)
@given(actions)
def test_what_sounds_never_exceeds_the_limit_and_after_a_stop_there_is_silence(done: list[Action]) -> None:
    table = Table()
    try:
        for action in done:
            table.act(action)
            table.assert_within_limit()
    finally:
        table.runner.stop()
    assert table.bench.sounding is None
    endings = [event for event in table.runner.screen.drain() if isinstance(event, Ended)]
    assert all(ended.ending is Ending.STOPPED or "is above the limit" in ended.why for ended in endings)
    table.bench.give(10**6)
    assert table.bench.sounding is None


@settings(max_examples=15)
@given(actions)
def test_a_tone_that_is_wished_and_allowed_sounds_in_the_end(done: list[Action]) -> None:
    table = Table()
    try:
        for action in done:
            table.act(action)
        table.runner.stop()
        table.runner.set_drive_limit_vrms(1.0)
        table.runner.wish(tone_on=True, frequency_hz=313.0, level_fs=0.4)
        table.act(("start", 0.0))
        table.bench.wait_until_asked()
        assert table.bench.sounding == Tone(313.0, 0.4, (1, 2))
        table.runner.wish(tone_on=False)
        table.runner.wish(tone_on=True)
        for _ in range(4):
            table.act(("frames", 24_000.0))
        assert table.bench.sounding == Tone(313.0, 0.4, (1, 2))
    finally:
        table.runner.stop()


def test_the_check_would_see_a_tone_above_the_limit() -> None:
    table = Table()
    try:
        table.bench.wait_until_asked()
        table.bench.play(Tone(997.0, 0.9))
        with pytest.raises(AssertionError):
            table.assert_within_limit()
    finally:
        table.runner.stop()
