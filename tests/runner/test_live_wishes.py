"""What a person wishes of a running watch is checked at once, and the drive limit holds whatever is wished."""

from collections.abc import Iterator
from typing import Any

import pytest

from tests.runner.fake_bench import FakeBench
from tests.runner.live_table import Table, opened, play_and_wait
from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Rig, Wiring
from wattproof.procedures.requests import Procedure, Wanted, Wishes
from wattproof.runner.live import Runner
from wattproof.runner.screen import ToneChanged

SILENCED = ToneChanged(on=False, frequency_hz=997.0, level_fs=0.4, why="the tone was above the new drive limit")


@pytest.fixture
def table() -> Iterator[Table]:
    with opened() as table:
        yield table


def test_wishes_stand_until_they_are_asked_for(table: Table) -> None:
    seen: list[object] = []

    def procedure() -> Procedure:
        seen.append((yield Wanted()))

    table.runner.wish(tone_on=True, frequency_hz=60.0, level_fs=0.25, channel=2)
    assert table.runner.wishes == Wishes(tone_on=True, frequency_hz=60.0, level_fs=0.25, channel=2)
    table.ending(procedure())
    assert seen == [Wishes(tone_on=True, frequency_hz=60.0, level_fs=0.25, channel=2)]


@pytest.mark.parametrize(
    ("wish", "said"),
    [
        ({"level_fs": 0.6}, "output 1: drive 1.2 V rms is above the limit of 1 V rms"),
        ({"level_fs": 1.2}, "drive 1.2 of full scale: give 0 to 1"),
        ({"level_fs": float("nan")}, "drive nan of full scale: give 0 to 1"),
        ({"frequency_hz": 24_000.0}, "frequency 24000 Hz: give more than 0 and less than 24000 Hz"),
        ({"frequency_hz": float("nan")}, "frequency nan Hz"),
        ({"frequency_hz": 0.0}, "frequency 0 Hz"),
        ({"channel": 3}, "input 3: this bench has inputs 1 to 2"),
    ],
)
def test_a_wish_that_cannot_be_is_refused_in_one_line_and_changes_nothing(
    table: Table, wish: dict[str, Any], said: str
) -> None:
    before = table.runner.wishes
    with pytest.raises(WrongUseError) as caught:
        table.runner.wish(**wish)
    assert str(caught.value).startswith(said)
    assert "\n" not in str(caught.value)
    assert table.runner.wishes == before


def test_a_tone_cannot_be_wished_while_muted(table: Table) -> None:
    table.bench.auto = False
    table.runner.start(play_and_wait())
    table.runner.mute()
    with pytest.raises(WrongUseError, match="the output is muted; start a new run"):
        table.runner.wish(tone_on=True)


def test_the_rig_tells_the_limit_in_force(table: Table) -> None:
    table.runner.set_drive_limit_vrms(0.5)
    assert table.runner.rig.limits.drive_vrms == 0.5
    assert table.rig.limits.drive_vrms == 1.0


def test_a_limit_that_comes_down_below_the_tone_silences_it_at_once_and_says_why(table: Table) -> None:
    table.bench.auto = False
    table.runner.start(play_and_wait())
    table.bench.wait_until_asked()
    table.runner.set_drive_limit_vrms(0.5)
    assert table.bench.sounding is None
    assert SILENCED in table.runner.screen.drain()


def test_a_rig_that_the_bench_does_not_have_is_refused() -> None:
    bench = FakeBench()
    with pytest.raises(WrongUseError, match="input 7: this bench has inputs 1 to 2"):
        Runner(bench, Rig(wirings=(Wiring(input=7),)), bench.calibration)
    with pytest.raises(WrongUseError, match="output 7: this bench has outputs 1 to 2"):
        Runner(bench, Rig(wirings=(Wiring(output=7),)), bench.calibration)


def test_a_bench_without_outputs_is_watched_without_any() -> None:
    bench = FakeBench(outputs=0)
    runner = Runner(bench, Rig(), bench.calibration)
    assert runner.outputs == ()
    with pytest.raises(WrongUseError, match="this bench has no output to sound a tone"):
        runner.wish(tone_on=True)
