"""The witnesses of lost frames, on logs written by hand: each with a truth that the test knows."""

import numpy as np
import pytest

from wattproof.bench.portaudio.gaps import GapFinder, Row
from wattproof.bench.portaudio.lookout import ZERO_S, ZeroWatch

RATE_HZ = 96_000
PERIOD = 1_024
ECHO = 2_000


class Log:
    """Callbacks of one period each, late by a little that varies, on a clock off by 100 ppm."""

    def __init__(self) -> None:
        self.finder = GapFinder(RATE_HZ, ECHO)
        self.frame = 0
        self.clock_s = 1_000.0
        self._lateness = np.random.default_rng(4)

    def call(self, periods: int = 1, *, late_s: float = 0.0, flags: int = 0) -> None:
        """Log callbacks."""
        for _ in range(periods):
            late = late_s + float(self._lateness.uniform(0.0, 0.0015))
            self.finder.look(Row(self.frame, PERIOD, flags, self.clock_s + late))
            self.frame += PERIOD
            self.clock_s += PERIOD / RATE_HZ * 1.0001

    def gaps(self) -> list[tuple[int, int, str]]:
        """All gaps, as plain numbers."""
        return [(gap.first_frame, gap.frames, gap.why) for gap in self.finder.touching(0, self.frame)]


def test_a_punctual_stream_is_not_suspected_for_ten_minutes() -> None:
    log = Log()
    log.call(600 * RATE_HZ // PERIOD)
    assert log.gaps() == []


def test_a_flag_makes_suspect_the_border_before_it_and_what_comes_back_later() -> None:
    log = Log()
    log.call(10)
    log.call(flags=2)
    log.call(100)
    assert log.gaps() == [(9 * PERIOD, 2 * PERIOD + ECHO, "flag")]
    assert log.finder.touching(0, 9 * PERIOD) == ()
    assert len(log.finder.touching(11 * PERIOD + ECHO - 1, 10)) == 1
    assert log.finder.touching(11 * PERIOD + ECHO, 10) == ()


def test_flags_in_a_row_are_one_stretch() -> None:
    log = Log()
    log.call(10)
    log.call(5, flags=2)
    assert log.gaps() == [(9 * PERIOD, 6 * PERIOD + ECHO, "flag")]


def test_a_late_callback_is_suspect_until_the_next_ones_are_punctual_again() -> None:
    log = Log()
    log.call(200)
    log.call(late_s=0.03)
    assert log.gaps() == [(199 * PERIOD, 2 * PERIOD, "clock")]
    log.call()
    assert log.gaps() == []


@pytest.mark.parametrize("lost", [512, PERIOD, 10 * PERIOD])
def test_frames_that_never_came_are_suspect_for_good(lost: int) -> None:
    log = Log()
    log.call(200)
    log.clock_s += lost / RATE_HZ
    log.call()
    assert log.gaps() == [(199 * PERIOD, 2 * PERIOD, "clock")]
    log.call(1_000)
    assert log.gaps() == [(199 * PERIOD, 2 * PERIOD, "clock")]


def test_a_second_loss_is_found_after_the_first() -> None:
    log = Log()
    for _ in range(2):
        log.call(300)
        log.clock_s += PERIOD / RATE_HZ
    log.call(300)
    assert [gap[0] for gap in log.gaps()] == [299 * PERIOD, 599 * PERIOD]


def test_frames_that_came_twice_are_suspect() -> None:
    log = Log()
    log.call(200)
    log.clock_s -= PERIOD / RATE_HZ
    log.call(200)
    assert log.gaps() == [(199 * PERIOD, 2 * PERIOD, "clock")]


def test_what_nobody_can_ask_for_any_more_is_forgotten() -> None:
    log = Log()
    log.call(3, flags=2)
    log.call(100)
    log.finder.forget(50 * PERIOD)
    assert log.gaps() == []


def block(frames: int, value: float = 0.0) -> "np.ndarray[tuple[int, int], np.dtype[np.float32]]":
    return np.full((frames, 2), value, dtype=np.float32)


def test_a_tone_that_turns_into_exact_zeros_is_lost_after_a_tenth_of_a_second() -> None:
    watch = ZeroWatch(RATE_HZ)
    limit = round(ZERO_S * RATE_HZ)
    watch.sound(1_000, changed=True)
    assert not watch.look(0, block(5_000, 0.1))
    assert not watch.look(5_000, block(limit - 1))
    assert watch.look(5_000 + limit - 1, block(1))


@pytest.mark.parametrize("when", ["before the tone", "never heard", "silenced", "other outputs"])
def test_zeros_are_no_loss_where_they_are_no_wonder(when: str) -> None:
    watch = ZeroWatch(RATE_HZ)
    if when == "before the tone":
        watch.look(0, block(5_000, 0.1))
    elif when == "never heard":
        watch.sound(0, changed=True)
    else:
        watch.sound(0, changed=True)
        watch.look(0, block(5_000, 0.1))
        if when == "silenced":
            watch.silence()
        else:
            watch.sound(5_000, changed=True)
    assert not watch.look(5_000, block(RATE_HZ))


def test_a_change_of_level_does_not_make_a_dead_device_live() -> None:
    watch = ZeroWatch(RATE_HZ)
    watch.sound(0, changed=True)
    watch.look(0, block(5_000, 0.1))
    for at in range(5_000, 30_000, 5_000):
        watch.sound(at, changed=False)
        lost = watch.look(at, block(5_000))
    assert lost
