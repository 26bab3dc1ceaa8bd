"""The drive rises no faster than stated, whatever is asked; and never above the limit, by any sequence of actions."""

import contextlib
import threading

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.runner.fake_bench import FULL_SCALE_VRMS, RATE_HZ, FakeBench
from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.core.rig import Limits, Rig, Wiring
from wattproof.core.signal import Tone
from wattproof.core.units import db, from_db
from wattproof.procedures.requests import Acquire, Action, Ask, Play, Procedure
from wattproof.runner.live import Runner
from wattproof.runner.slew import PLACE_KEPT_S, START_FS, DriveSlew

_ROUNDING = 1.0 + 1e-5


def tone(level_fs: float) -> Tone:
    return Tone(997.0, level_fs)


def test_from_silence_it_begins_at_minus_60_dbfs() -> None:
    slew = DriveSlew(20.0)
    slew.check(tone(0.001), 0.0)
    with pytest.raises(WrongUseError, match="20 dB/s"):
        slew.check(tone(0.0012), 0.0)


def test_it_rises_by_the_rate() -> None:
    slew = DriveSlew(20.0)
    slew.played(tone(0.001), 1.0)
    assert slew.highest_fs(1.5) == pytest.approx(0.001 * from_db(10.0), rel=1e-12, abs=0.0)
    slew.check(tone(0.0031), 1.5)
    with pytest.raises(WrongUseError, match="rises faster"):
        slew.check(tone(0.0033), 1.5)


def test_a_short_pause_keeps_its_place_and_a_long_one_does_not() -> None:
    slew = DriveSlew(20.0)
    slew.played(tone(0.1), 0.0)
    slew.played(tone(0.0), 0.3)
    slew.check(tone(0.1), 1.7)
    with pytest.raises(WrongUseError, match="rises faster"):
        slew.check(tone(0.1), 0.4 + PLACE_KEPT_S)


def test_a_question_or_a_new_run_begins_anew() -> None:
    slew = DriveSlew(20.0)
    slew.played(tone(0.1), 0.0)
    slew.restart()
    assert slew.highest_fs(0.1) == START_FS


def test_a_rate_must_be_a_rate() -> None:
    with pytest.raises(WrongUseError, match="rise"):
        DriveSlew(0.0)


plays = st.tuples(st.just("play"), st.floats(0.0, 1.0) | st.floats(-70.0, 0.0).map(from_db))
waits = st.tuples(st.just("wait"), st.floats(0.01, 8.0))
limits = st.tuples(st.just("limit"), st.floats(0.0, 2.0))
asks = st.tuples(st.just("ask"), st.just(0.0))
mutes = st.tuples(st.just("mute"), st.just(0.0))
actions = st.lists(st.one_of(plays, plays, waits, limits, asks, mutes), min_size=1, max_size=40)


class Insistent:
    """A procedure that plays whatever it likes and shrugs a refusal off; everything that sounds is written down."""

    def __init__(self, rate_db_per_s: float) -> None:
        self.bench = FakeBench()
        self.runner = Runner(
            self.bench,
            Rig(wirings=(Wiring(), Wiring(output=2, input=2)), limits=Limits(drive_vrms=1.0)),
            self.bench.calibration,
            hand=lambda _ask: "done",
            slew=DriveSlew(rate_db_per_s),
        )
        self.heard: list[tuple[float, float, float]] = []  # time, level, limit at that time
        self.bench.on_sound = self._hear
        self.done = threading.Event()

    def _hear(self, sounding: Tone) -> None:
        now_s = self.bench.next_frame / RATE_HZ
        self.heard.append((now_s, sounding.level_fs, self.runner.limit.vrms / FULL_SCALE_VRMS))

    def procedure(self, wanted: list[tuple[str, float]]) -> Procedure:
        try:
            for what, value in wanted:
                yield from self._act(what, value)
        finally:
            self.done.set()

    def _act(self, what: str, value: float) -> Procedure:
        match what:
            case "play":
                with contextlib.suppress(WattproofError):
                    yield Play(Tone(997.0, value, (1, 2)))
            case "wait":
                yield Acquire(round(value * RATE_HZ))
            case "ask":
                yield Ask(Action.CONFIRM, "anything")
            case "limit":
                self.runner.limit.set_vrms(value)
            case _:
                self.runner.mute("for no reason")


@settings(max_examples=30)
@given(actions, st.sampled_from([6.0, 20.0]))
def test_no_sequence_of_actions_reaches_a_drive_above_the_limit_or_rises_too_fast(
    wanted: list[tuple[str, float]], rate: float
) -> None:
    table = Insistent(rate)
    table.runner.start(table.procedure(wanted))
    assert table.done.wait(20.0)
    table.runner.close()
    assert all(level <= limit * _ROUNDING for _, level, limit in table.heard)
    before: tuple[float, float] | None = None
    for now_s, level, _ in table.heard:
        if level > START_FS * _ROUNDING:
            assert before is not None
            rise_db = db(level / before[1])
            assert rise_db <= rate * (now_s - before[0]) + 0.2  # the fake's latency of 10 ms counts on one side only
        if level:
            before = now_s, level
