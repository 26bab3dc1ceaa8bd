"""The runner's promises: silence on every way out, nothing above the limit, a stop that never hangs."""

from collections.abc import Iterator

import attrs
import pytest

from tests.runner.fake_bench import RATE_HZ
from tests.runner.live_table import TIMEOUT_S, TONE, Table, opened, play_and_wait
from wattproof.core.errors import StoppedError, WattproofError, WrongUseError
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.rig import Limits
from wattproof.core.run import Ending
from wattproof.core.signal import Capture, Span, Tone
from wattproof.procedures.requests import Acquire, Action, Ask, Kept, Play, Procedure, Shown
from wattproof.runner.screen import Asked, Ended, ReadingsTaken, ToneChanged


@pytest.fixture
def table() -> Iterator[Table]:
    with opened() as table:
        yield table


def reading(span: Span, level_vrms: float | None = None) -> Reading:
    level = None if level_vrms is None else measured(level_vrms, 0.0, "V")
    return Reading(span=span, channel=1, settings=ReadingSettings(), state=State.OK, level_vrms=level)


def test_a_run_sounds_what_it_plays_and_is_silent_when_it_is_done(table: Table) -> None:
    def procedure() -> Procedure:
        yield Play(TONE)
        yield Acquire(480)

    assert table.ending(procedure()) == Ended(Ending.DONE)
    assert table.bench.heard == [TONE]
    assert table.bench.sounding is None
    assert table.runner.muted


def test_the_answer_to_play_is_the_frame_from_which_it_stands_and_blocks_begin_there(table: Table) -> None:
    seen: list[object] = []

    def procedure() -> Procedure:
        seen.append((yield Play(TONE)))
        capture = yield Acquire(480)
        assert isinstance(capture, Capture)
        seen.append(capture.first_frame)

    table.ending(procedure())
    assert seen[0] == seen[1] == 480


def test_a_stop_silences_and_ends_it(table: Table) -> None:
    table.bench.auto = False
    table.runner.start(play_and_wait())
    table.bench.wait_until_asked()
    assert table.bench.sounding == TONE
    table.runner.stop()
    assert table.bench.sounding is None
    assert table.ended() == Ended(Ending.STOPPED)


def test_an_error_in_the_procedure_silences_and_is_told_in_one_line(table: Table) -> None:
    def procedure() -> Procedure:
        yield Play(TONE)
        raise ZeroDivisionError("division by zero\nover lines")

    assert table.ending(procedure()) == Ended(
        Ending.FAILED, "unexpected ZeroDivisionError: division by zero over lines; the log file has the details"
    )
    assert table.bench.sounding is None


def test_a_lost_device_silences_and_is_told(table: Table) -> None:
    table.bench.auto = False
    table.runner.start(play_and_wait())
    table.bench.wait_until_asked()
    table.bench.lose()
    assert table.ended() == Ended(Ending.FAILED, "the fake bench is gone")
    assert table.bench.sounding is None


def test_a_bench_that_hangs_is_given_up_muted_and_told_within_the_deadline(table: Table) -> None:
    table.bench.auto = False
    table.runner.start(play_and_wait())
    table.bench.wait_until_asked()
    table.bench.hangs.set()
    table.runner.stop(deadline_s=0.05)
    assert table.bench.sounding is None
    assert table.ended() == Ended(Ending.FAILED, "the bench did not answer within 0.05 s; the output is muted")
    with pytest.raises(WrongUseError, match="a run is still under way"):
        table.runner.start(play_and_wait())
    assert table.bench.sounding is None
    table.bench.hangs.clear()
    table.runner.stop()
    assert table.runner.screen.drain() == []


def test_closing_silences_and_lets_go_of_the_bench(table: Table) -> None:
    table.runner.start(play_and_wait())
    table.runner.close()
    assert table.bench.sounding is None
    assert table.bench.closed
    assert table.ended().ending is Ending.STOPPED


def test_a_drive_above_the_limit_is_refused_before_it_sounds(table: Table) -> None:
    def procedure() -> Procedure:
        yield Play(Tone(997.0, 0.6))

    ended = table.ending(procedure())
    assert ended.ending is Ending.FAILED
    assert ended.why.startswith("output 1: drive 1.2 V rms is above the limit of 1 V rms")
    assert table.bench.heard == []


@pytest.mark.parametrize(
    ("tone", "said"),
    [
        (Tone(24_000.0, 0.1), "frequency 24000 Hz: give more than 0 and less than 24000 Hz"),
        (Tone(997.0, 0.1, (3,)), "output 3: this bench has outputs 1 to 2"),
    ],
)
def test_a_tone_that_the_bench_cannot_do_is_refused(table: Table, tone: Tone, said: str) -> None:
    def procedure() -> Procedure:
        yield Play(tone)

    assert table.ending(procedure()) == Ended(Ending.FAILED, said)


def test_mute_silences_at_once_and_holds_until_a_new_run(table: Table) -> None:
    def sound_twice() -> Procedure:
        yield Play(TONE)
        yield Acquire(480)
        yield Acquire(480)
        yield Play(attrs.evolve(TONE, frequency_hz=60.0))
        yield Acquire(480)
        yield Acquire(480)

    table.bench.auto = False
    table.runner.start(sound_twice())
    table.bench.give(table.bench.wait_until_asked())
    table.runner.mute()
    assert table.bench.sounding is None
    table.bench.auto = True
    table.bench.give(10)
    table.ended()
    assert table.bench.heard == [TONE]
    table.ending(sound_twice())
    assert len(table.bench.heard) == 3


def test_only_one_run_at_a_time(table: Table) -> None:
    table.bench.auto = False
    table.runner.start(play_and_wait())
    with pytest.raises(WrongUseError, match="a run is still under way; stop it"):
        table.runner.start(play_and_wait())


def test_a_run_may_start_as_soon_as_the_last_one_told_its_ending(table: Table) -> None:
    def procedure() -> Procedure:
        yield Play(TONE)

    for _ in range(50):
        assert table.ending(procedure()) == Ended(Ending.DONE)


def test_the_screen_is_told_the_tone_the_readings_and_the_ending_in_order(table: Table) -> None:
    shown = Shown((reading(Span(0, 480, RATE_HZ)),))

    def procedure() -> Procedure:
        yield Play(TONE)
        yield shown

    table.ending(procedure())
    on, taken, off, ended = table.told
    assert on == ToneChanged(on=True, frequency_hz=997.0, level_fs=0.4)
    assert isinstance(taken, ReadingsTaken)
    assert taken.readings == shown.readings
    assert off == ToneChanged(on=False, frequency_hz=997.0, level_fs=0.4)
    assert isinstance(ended, Ended)
    assert table.runner.screen.newest() is shown


def test_a_question_waits_for_its_answer(table: Table) -> None:
    ask = Ask(Action.SWITCH_LOAD, 4.0)
    answers: list[object] = []

    def procedure() -> Procedure:
        answers.append((yield ask))
        answers.append((yield ask))

    table.runner.start(procedure())
    first = table.until(Asked)
    assert isinstance(first, Asked)
    assert first.ask == ask
    table.runner.answer(first.ask_id, 4.0)
    second = table.until(Asked)
    assert isinstance(second, Asked)
    with pytest.raises(WrongUseError, match=f"question {first.ask_id} is not open"):
        table.runner.answer(first.ask_id, 8.0)
    table.runner.answer(second.ask_id, "done")
    assert table.ended() == Ended(Ending.DONE)
    assert answers == [4.0, "done"]


def test_a_stop_ends_the_waiting_for_an_answer(table: Table) -> None:
    def procedure() -> Procedure:
        yield Ask(Action.CONFIRM, "wired")

    table.runner.start(procedure())
    asked = table.until(Asked)
    assert isinstance(asked, Asked)
    table.runner.stop()
    assert table.ended() == Ended(Ending.STOPPED)
    with pytest.raises(WrongUseError, match="is not open"):
        table.runner.answer(asked.ask_id, "late")


def test_what_was_kept_has_its_raw_capture_with_half_a_second_before_it() -> None:
    kept: list[tuple[Kept, Capture]] = []
    table = Table(keeper=lambda record, capture: kept.append((record, capture)))

    def procedure() -> Procedure:
        yield Acquire(48_000)
        block = yield Acquire(480)
        assert isinstance(block, Capture)
        yield Kept(reading(block.span))

    assert table.ending(procedure()) == Ended(Ending.DONE)
    ((record, capture),) = kept
    assert record.reading.span == Span(48_000, 480, RATE_HZ)
    assert (capture.first_frame, capture.frames) == (24_000, 24_480)
    assert table.runner.kept() == 1


def test_a_record_that_names_no_capture_fails_the_run() -> None:
    table = Table(keeper=lambda record, capture: None)  # noqa: ARG005 - a keeper takes both

    def procedure() -> Procedure:
        yield Acquire(480)
        yield Kept(reading(Span(9000, 480, RATE_HZ)))

    assert table.ending(procedure()) == Ended(Ending.FAILED, "the raw capture of frames 9000 to 9480 is no longer held")


def test_a_keeper_that_fails_ends_the_run_in_silence() -> None:
    def keeper(_record: Kept, _capture: Capture) -> None:
        raise WattproofError("the session file is on a full disk; free some space")

    table = Table(keeper=keeper)

    def procedure() -> Procedure:
        yield Play(TONE)
        block = yield Acquire(480)
        assert isinstance(block, Capture)
        yield Kept(reading(block.span))

    ended = table.ending(procedure())
    assert ended == Ended(Ending.FAILED, "the session file is on a full disk; free some space")
    assert table.bench.sounding is None
    assert table.runner.kept() == 0


def test_a_reading_above_a_limit_of_the_rig_mutes_and_says_why() -> None:
    table = Table(limits=Limits(drive_vrms=1.0, output_vrms=20.0))

    def procedure() -> Procedure:
        yield Play(TONE)
        yield Shown((reading(Span(0, 480, RATE_HZ), 19.0),))
        yield Shown((reading(Span(0, 480, RATE_HZ), 21.0),))
        yield Play(attrs.evolve(TONE, level_fs=0.1))

    table.ending(procedure())
    changes = [event for event in table.told if isinstance(event, ToneChanged)]
    assert [change.why for change in changes] == ["", "channel 1: output 21 V rms is above the limit of 20"]
    assert table.bench.heard == [TONE]


def test_mute_does_not_wait_for_a_bench_that_hangs_while_it_plays(table: Table) -> None:
    table.bench.play_hangs.set()
    table.runner.start(play_and_wait())
    assert table.bench.playing.wait(TIMEOUT_S)
    table.runner.mute()
    table.runner.set_drive_limit_vrms(0.1)
    table.bench.play_hangs.clear()
    table.runner.stop()
    assert table.bench.heard == []


def test_the_procedure_sees_the_stop_that_ended_it(table: Table) -> None:
    seen: list[type[BaseException]] = []

    def procedure() -> Procedure:
        try:
            yield from play_and_wait()
        except StoppedError as error:
            seen.append(type(error))
            raise

    table.bench.auto = False
    table.runner.start(procedure())
    table.bench.wait_until_asked()
    table.runner.stop()
    assert seen == [StoppedError]
