"""A watch on the simulated bench with the real analysis: readings come, mute holds, and the tone begins a new watch."""

import time
from collections.abc import Callable, Iterator

import pytest

from tests.procedures.fake_reader import FakeReader
from tests.runner.fake_bench import RATE_HZ, FakeBench
from wattproof.app import make_watch_runner
from wattproof.bench.simulated import SimulatedBench
from wattproof.core.errors import WrongUseError
from wattproof.core.reading import Reading, State
from wattproof.core.rig import Rig, Wiring
from wattproof.core.run import Ending
from wattproof.core.signal import Tone
from wattproof.procedures.watch import Watch, reading_settings, watch
from wattproof.runner.screen import Ended, Event, ReadingsTaken
from wattproof.runner.watching import WatchRunner

TIMEOUT_S = 60.0


class Viewer:
    """Looks at a runner's screen as a window does, and remembers what was told."""

    def __init__(self, runner: WatchRunner) -> None:
        self.runner = runner
        self.told: list[Event] = []

    def until(self, wanted: Callable[[Event], bool]) -> Event:
        """Wait until an event is told that is wanted, and return it."""
        deadline = time.monotonic() + TIMEOUT_S
        while time.monotonic() < deadline:
            for event in self.runner.screen.drain():
                self.told.append(event)
                if wanted(event):
                    return event
            time.sleep(0.002)
        pytest.fail(f"not told within {TIMEOUT_S} s among {[type(event).__name__ for event in self.told[-9:]]}")

    def reading(self, wanted: Callable[[Reading], bool]) -> Reading:
        """Wait for a reading of channel 1 that is wanted, and return it."""
        event = self.until(lambda event: isinstance(event, ReadingsTaken) and wanted(event.readings[0]))
        assert isinstance(event, ReadingsTaken)
        return event.readings[0]


def is_sound(reading: Reading) -> bool:
    return reading.state is State.OK


@pytest.fixture
def simulated() -> Iterator[Viewer]:
    bench = SimulatedBench()
    bench.open()
    runner = make_watch_runner(bench)
    yield Viewer(runner)
    runner.close()


def test_the_simulated_bench_is_watched_at_once_with_its_tone_on(simulated: Viewer) -> None:
    reading = simulated.reading(is_sound)
    assert simulated.runner.wishes.tone_on
    assert reading.fundamental_hz is not None
    assert reading.fundamental_hz.value == pytest.approx(997.0, rel=1e-6, abs=0)  # its clocks run alike
    assert reading.settings.load_ohm == 8.0
    assert reading.settings.full_scale_vrms == pytest.approx(20.0, rel=1e-12, abs=0)  # 2 V through a divider by 10
    picture = simulated.runner.screen.newest()
    assert picture is not None
    assert picture.picture is not None


def test_turning_the_knob_up_is_seen_as_clipping(simulated: Viewer) -> None:
    quiet = simulated.reading(is_sound)
    assert quiet.thdn is not None
    assert quiet.thdn.value < 0.003  # as each simulated amplifier promises between 10 % and 95 % of its onset
    simulated.runner.bench.turn("knob", 0.0)
    loud = simulated.reading(
        lambda reading: is_sound(reading) and reading.thdn is not None and reading.thdn.value > 0.1
    )
    assert loud.power_w is not None
    assert loud.power_w.value > 5.0


def test_switching_the_load_is_followed_by_readings_and_rig(simulated: Viewer) -> None:
    simulated.reading(is_sound)
    simulated.runner.bench.turn("load", 4.0)
    reading = simulated.reading(lambda reading: is_sound(reading) and reading.settings.load_ohm == 4.0)
    assert reading.power_w is not None
    assert reading.level_vrms is not None
    assert reading.power_w.value == pytest.approx(reading.level_vrms.value**2 / 4.0, rel=1e-9, abs=0)
    assert [wiring.load.ohm for wiring in simulated.runner.rig.wirings] == [4.0, 4.0]


def test_the_limits_stay_a_persons_whatever_is_switched(simulated: Viewer) -> None:
    simulated.runner.set_drive_limit_vrms(0.3)
    simulated.runner.bench.turn("load", 4.0)
    assert simulated.runner.rig.limits.drive_vrms == 0.3


def test_muted_it_reads_silence_and_the_tone_begins_a_new_watch(simulated: Viewer) -> None:
    simulated.reading(is_sound)
    simulated.runner.mute()
    simulated.reading(lambda reading: reading.state is State.NO_TONE)
    assert simulated.runner.muted
    assert not simulated.runner.wishes.tone_on
    simulated.runner.wish(tone_on=True)
    assert not simulated.runner.muted
    simulated.reading(is_sound)


def test_after_its_end_the_tone_begins_a_new_watch_too(simulated: Viewer) -> None:
    simulated.reading(is_sound)
    simulated.runner.stop()
    ended = simulated.until(lambda event: isinstance(event, Ended))
    assert ended == Ended(Ending.STOPPED)
    simulated.runner.wish(tone_on=True)
    simulated.reading(is_sound)


def test_a_wish_above_the_limit_leaves_a_muted_watch_watching_in_silence(simulated: Viewer) -> None:
    simulated.runner.mute()
    with pytest.raises(WrongUseError, match="above the limit"):
        simulated.runner.wish(tone_on=True, level_fs=0.9)
    assert simulated.runner.running
    simulated.reading(lambda reading: reading.state is State.NO_TONE)


def _watching(bench: FakeBench) -> WatchRunner:
    settings = reading_settings(Rig(), bench.calibration, 2)
    return WatchRunner(
        bench,
        lambda: Rig(wirings=(Wiring(), Wiring(output=2, input=2))),
        bench.calibration,
        lambda: watch(Watch(), FakeReader(RATE_HZ, settings), RATE_HZ, (1, 2)),
    )


def test_a_bench_that_does_not_say_what_is_wired_is_watched_in_silence_until_a_person_wishes_the_tone() -> None:
    bench = FakeBench(auto=False, real=True)
    runner = make_watch_runner(bench, FakeReader)
    try:
        bench.wait_until_asked()
        assert runner.running
        assert bench.heard == []
        runner.wish(tone_on=True)
        for _ in range(3):
            bench.give(24_000)
            bench.wait_until_asked()
        assert bench.sounding == Tone(997.0, Watch().level_fs, (1,))
    finally:
        runner.close()
    assert bench.closed
    assert bench.sounding is None


def test_wishes_before_the_first_watch_begin_none() -> None:
    runner = _watching(FakeBench(auto=False))
    runner.wish(tone_on=True, level_fs=0.1)
    assert not runner.running
    runner.begin()
    assert runner.running
    runner.close()


def test_a_tone_that_is_turned_off_and_on_again_at_once_sounds() -> None:
    bench = FakeBench(auto=False)
    runner = _watching(bench)
    runner.wish(tone_on=True, level_fs=0.1)
    runner.begin()
    try:
        bench.wait_until_asked()
        runner.wish(tone_on=False)
        assert bench.sounding is None
        runner.wish(tone_on=True)
        for _ in range(4):
            bench.give(24_000)
            bench.wait_until_asked()
        assert bench.sounding == Tone(997.0, 0.1, (1, 2))
    finally:
        runner.close()
