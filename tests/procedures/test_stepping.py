"""Stepped tones under the guard: bursts where sustained power burns parts, and a rise no faster than is allowed."""

import math
from itertools import pairwise

import pytest

from tests.procedures.sitting import ran
from wattproof.bench.simulated import SimulatedBench
from wattproof.core.run import Ending
from wattproof.core.signal import Tone
from wattproof.procedures.around_plan import frequencies
from wattproof.procedures.guard import BURST_DUTY, BURST_S
from wattproof.procedures.response import ResponsePlan
from wattproof.procedures.stepping import in_bursts

RATE_HZ = 96_000.0


class Listening(SimulatedBench):
    """A bench that remembers what was played, and from when on."""

    def play(self, tone: Tone) -> int:
        stands = super().play(tone)
        played.append((stands / RATE_HZ, tone))
        return stands


played: list[tuple[float, Tone]] = []


@pytest.fixture(scope="module")
def told() -> list[tuple[float, Tone]]:
    played.clear()
    plan = ResponsePlan(channels="1", from_hz=20.0, to_hz=12_000.0, per_octave=1.0, level_vrms=1.0)
    assert ran(plan, bench=Listening()).ending is Ending.DONE
    return list(played)


def test_tones_that_burn_parts_sound_for_half_a_second_at_most(told: list[tuple[float, Tone]]) -> None:
    bursts = [
        (begin_s, end_s)
        for (begin_s, tone), (end_s, _) in pairwise(told)
        if tone.level_fs > 0.0 and in_bursts(tone.frequency_hz)
    ]
    assert len(bursts) >= 3
    for begin_s, end_s in bursts:
        assert end_s - begin_s < BURST_S


def test_a_burst_is_followed_by_silence_that_keeps_the_duty(told: list[tuple[float, Tone]]) -> None:
    for (begin_s, tone), (end_s, after), (next_s, _) in zip(told, told[1:], told[2:], strict=False):
        if tone.level_fs > 0.0 and in_bursts(tone.frequency_hz):
            assert after.level_fs == 0.0
            # a chunk of the bench (11 ms) belongs to neither
            assert (end_s - begin_s) / (next_s - begin_s) < BURST_DUTY + 0.02


def test_the_drive_rises_from_the_bottom_and_no_faster_than_20_db_a_second(told: list[tuple[float, Tone]]) -> None:
    sounding = [(at_s, tone) for at_s, tone in told if tone.level_fs > 0.0]
    assert sounding[0][1].level_fs <= 0.001 * (1.0 + 1e-9)
    for (before_s, before), (at_s, tone) in pairwise(sounding):
        rise_db = 20.0 * math.log10(tone.level_fs / before.level_fs)
        assert rise_db <= 20.0 * (at_s - before_s) + 1e-6


def test_tones_keep_clear_of_the_mains_where_that_is_asked() -> None:
    tones = frequencies(100.0, 20_000.0, 3.0, 4.0)
    assert len(tones) >= 23
    for hz in tones:
        if hz < 2_000.0:
            assert min(abs(hz - mains * round(hz / mains)) for mains in (50.0, 60.0)) >= 4.0
    assert tones[0] == pytest.approx(104.0, rel=0.0, abs=0.01)  # 100 Hz is the second line of 50 Hz
