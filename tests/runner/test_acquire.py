"""Blocks follow without a hole; one that a gap or a change of level runs through is refused, never read."""

import threading

import pytest

from tests.runner.fake_bench import LATENCY, RATE_HZ, FakeBench
from wattproof.core.errors import BenchLostError, StoppedError
from wattproof.core.notes import Kind, Note
from wattproof.core.signal import Gap, Overload, Tone
from wattproof.core.wording import sentence
from wattproof.procedures.requests import Acquire
from wattproof.runner.acquire import CHANGE_LEAD_S, CHANGE_SETTLE_S, LONGEST_LAG_S, Blocks


class Table:
    """A bench, the blocks cut from it, and what was refused."""

    def __init__(self) -> None:
        self.bench = FakeBench()
        self.stop = threading.Event()
        self.refused: list[Note] = []
        self.blocks = Blocks(self.bench, self.stop, self.refused.append)

    def spans(self, request: Acquire, count: int) -> list[tuple[int, int]]:
        captures = [self.blocks.acquire(request) for _ in range(count)]
        return [(capture.first_frame, capture.span.end_frame) for capture in captures]


def test_blocks_follow_where_the_last_one_ended() -> None:
    assert Table().spans(Acquire(100), 3) == [(0, 100), (100, 200), (200, 300)]


def test_a_hop_lets_them_overlap() -> None:
    assert Table().spans(Acquire(100, hop=40), 3) == [(0, 100), (40, 140), (80, 180)]


def test_the_first_block_after_a_tone_waits_until_it_stands_and_has_settled() -> None:
    table = Table()
    stands = table.bench.play(Tone(997.0, 0.1))
    table.blocks.tone_stands(stands)
    request = Acquire(100, hop=40, settle_s=0.01)
    assert table.spans(request, 2) == [(LATENCY + 480, LATENCY + 580), (LATENCY + 520, LATENCY + 620)]


def test_renew_starts_from_the_newest_frames() -> None:
    table = Table()
    table.spans(Acquire(100), 1)
    table.bench.give(5000)
    assert table.spans(Acquire(100), 1) == [(100, 200)]
    assert table.spans(Acquire(100, renew=True), 1) == [(5100, 5200)]


def test_a_block_that_touches_a_gap_is_refused_and_the_next_one_begins_behind_it() -> None:
    table = Table()
    table.bench.gaps = [Gap(150, 30, "the callback was late")]
    assert table.spans(Acquire(100), 3) == [(0, 100), (180, 280), (280, 380)]
    (note,) = table.refused
    assert note.kind is Kind.GAP
    assert "0.003 s (the callback was late)" in sentence(note)


def test_a_gap_of_which_only_the_place_is_known_is_refused_too() -> None:
    table = Table()
    table.bench.gaps = [Gap(150, 1, "phase step")]
    assert table.spans(Acquire(100), 2) == [(0, 100), (151, 251)]


def test_a_block_across_a_silence_that_came_from_elsewhere_is_refused() -> None:
    table = Table()
    table.spans(Acquire(4800), 1)
    table.blocks.level_changed()
    ((first, _),) = table.spans(Acquire(4800), 1)
    assert first == 4800 + round(CHANGE_SETTLE_S * RATE_HZ)
    assert [note.kind for note in table.refused] == [Kind.LEVEL_STEP]
    assert "steps by −∞ dB" in sentence(table.refused[0])


def test_a_block_that_ended_before_the_silence_is_read() -> None:
    table = Table()
    table.bench.give(10_000)
    table.blocks.level_changed()
    end = 10_000 - round(CHANGE_LEAD_S * RATE_HZ)
    table.blocks.tone_stands(end - 100)
    assert table.spans(Acquire(100), 1) == [(end - 100, end)]
    assert table.refused == []


def test_an_overloaded_block_is_delivered_with_what_was_seen() -> None:
    table = Table()
    table.bench.overloads = [Overload(1, 20, 4)]
    assert table.blocks.acquire(Acquire(100)).overloads == (Overload(1, 20, 4),)
    assert table.refused == []


def test_a_reading_that_fell_behind_is_brought_back_to_the_present_and_the_hole_is_told() -> None:
    table = Table()
    table.spans(Acquire(100), 1)
    late = round((LONGEST_LAG_S + 1.0) * RATE_HZ)
    table.bench.give(late)
    assert table.spans(Acquire(100), 1) == [(100 + late, 200 + late)]
    assert [note.kind for note in table.refused] == [Kind.GAP]


def test_a_stop_ends_the_waiting() -> None:
    table = Table()
    table.stop.set()
    with pytest.raises(StoppedError):
        table.blocks.acquire(Acquire(100))


def test_gaps_without_end_do_not_outlast_a_stop() -> None:
    table = Table()
    table.bench.gaps = [Gap(0, 10**9, "nothing comes")]
    table.bench.auto = False
    ended: list[Exception] = []

    def acquire() -> None:
        try:
            table.blocks.acquire(Acquire(100))
        except StoppedError as error:
            ended.append(error)

    thread = threading.Thread(target=acquire)
    thread.start()
    table.bench.give(table.bench.wait_until_asked())
    table.bench.wait_until_asked()
    table.stop.set()
    thread.join(20.0)
    assert len(ended) == 1


def test_a_lost_bench_is_an_error() -> None:
    table = Table()
    table.bench.lose()
    table.bench.auto = False
    with pytest.raises(BenchLostError):
        table.blocks.acquire(Acquire(100))
