"""Raw captures are held with their lead-in until a record names them, and not for ever."""

import threading

import numpy as np
import pytest

from tests.runner.fake_bench import RATE_HZ, FakeBench
from wattproof.core.errors import WattproofError
from wattproof.core.signal import Capture, Gap, Span, Tone
from wattproof.runner.held import HELD_S, LEAD_IN_S, Held

LEAD = round(LEAD_IN_S * RATE_HZ)


def _block(bench: FakeBench, first_frame: int, frames: int) -> Capture:
    return bench.capture(first_frame, frames, threading.Event())


def test_the_lead_in_and_the_block_are_one_stretch_of_what_was_captured() -> None:
    bench = FakeBench()
    bench.play(Tone(997.0, 0.3))
    held = Held(bench, threading.Event())
    held.hold(_block(bench, 30_000, 480))
    raw = held.release(Span(30_000, 480, RATE_HZ))
    assert raw.span == Span(30_000 - LEAD, LEAD + 480, RATE_HZ)
    np.testing.assert_array_equal(raw.samples, _block(bench, 30_000 - LEAD, LEAD + 480).samples)


def test_at_the_beginning_the_lead_in_is_what_there_is() -> None:
    bench = FakeBench()
    held = Held(bench, threading.Event())
    held.hold(_block(bench, 100, 480))
    assert held.release(Span(100, 480, RATE_HZ)).first_frame == 0
    held.hold(_block(bench, 0, 480))
    assert held.release(Span(0, 480, RATE_HZ)).frames == 480


def test_a_gap_in_the_lead_in_stays_known() -> None:
    bench = FakeBench()
    bench.gaps = [Gap(20_000, 10, "the callback was late")]
    held = Held(bench, threading.Event())
    held.hold(_block(bench, 30_000, 480))
    assert held.release(Span(30_000, 480, RATE_HZ)).gaps == tuple(bench.gaps)


def test_two_channels_may_name_the_same_block_and_a_part_of_it() -> None:
    bench = FakeBench()
    held = Held(bench, threading.Event())
    held.hold(_block(bench, 30_000, 480))
    assert held.release(Span(30_000, 480, RATE_HZ)) is held.release(Span(30_100, 380, RATE_HZ))


def test_older_ones_go_when_a_younger_one_is_named() -> None:
    bench = FakeBench()
    held = Held(bench, threading.Event())
    held.hold(_block(bench, 30_000, 480))
    held.hold(_block(bench, 30_480, 480))
    held.release(Span(30_480, 480, RATE_HZ))
    with pytest.raises(WattproofError, match="frames 30000 to 30480 is no longer held"):
        held.release(Span(30_000, 480, RATE_HZ))


def test_a_procedure_that_names_none_does_not_fill_the_memory() -> None:
    bench = FakeBench()
    held = Held(bench, threading.Event())
    second = round(RATE_HZ)
    blocks = round(HELD_S) + 3
    for index in range(blocks):
        held.hold(_block(bench, index * second, second))
    with pytest.raises(WattproofError):
        held.release(Span(2 * second, second, RATE_HZ))
    assert held.release(Span(3 * second, second, RATE_HZ)).frames == LEAD + second


def test_where_the_lead_in_is_gone_the_block_alone_is_evidence() -> None:
    bench = FakeBench()
    block = _block(bench, 30_000, 480)
    bench.auto = False
    bench.lose()
    bench.give(-40_000)  # the fake answers a lost device only where it has to wait
    held = Held(bench, threading.Event())
    held.hold(block)
    assert held.release(block.span).samples is block.samples
