"""The simulated hand does what is asked on the bench's own controls, and leaves alone what it cannot do."""

import pytest

from tests.runner.fake_bench import FakeBench
from wattproof.bench.simulated import SimulatedBench
from wattproof.core.errors import WrongUseError
from wattproof.procedures.power_switching import YES
from wattproof.procedures.requests import Action, Ask
from wattproof.runner.hands import BenchHand


def opened() -> SimulatedBench:
    bench = SimulatedBench()
    bench.open()
    return bench


def stands(bench: SimulatedBench, name: str) -> float:
    return next(control.value for control in bench.controls if control.name == name)


def test_it_confirms_switches_and_turns() -> None:
    bench = opened()
    hand = BenchHand(bench)
    assert hand(Ask(Action.CONFIRM, "8")) == YES
    assert hand(Ask(Action.SWITCH_LOAD, 4.0)) == 4.0
    assert stands(bench, "load") == 4.0
    assert hand(Ask(Action.SWITCH_CHANNEL, 2.0)) == 2.0
    hand(Ask(Action.TURN, "full"))
    assert stands(bench, "knob") == 0.0
    hand(Ask(Action.TURN, "down"))
    assert stands(bench, "knob") < -40.0


@pytest.mark.parametrize("speed", [2.0, 20.0])
def test_it_turns_at_its_speed(speed: float) -> None:
    import threading  # noqa: PLC0415 - only this test needs an event

    bench = opened()
    hand = BenchHand(bench, speed)
    hand(Ask(Action.TURN, "down"))
    bench.capture(0, 9600, threading.Event())
    begins = stands(bench, "knob")
    hand(Ask(Action.TURN, "up"))
    bench.capture(9600, 96_000, threading.Event())
    assert stands(bench, "knob") - begins == pytest.approx(speed, rel=0.05, abs=0.0)  # a chunk of 11 ms, and latency
    hand(Ask(Action.TURN, "leave"))
    left = stands(bench, "knob")
    bench.capture(105_600, 48_000, threading.Event())
    assert stands(bench, "knob") == left


def test_what_it_cannot_do_is_left_to_a_person() -> None:
    hand = BenchHand(opened())
    assert hand(Ask(Action.CONNECT, "a loudspeaker")) is None
    assert hand(Ask(Action.TURN, "sideways")) is None


def test_a_load_that_the_bench_does_not_have_is_refused() -> None:
    with pytest.raises(WrongUseError, match="load"):
        BenchHand(opened())(Ask(Action.SWITCH_LOAD, 2.0))


def test_a_bench_whose_controls_do_not_glide_is_turned_at_once() -> None:
    turned: list[tuple[str, float]] = []

    class Turning(FakeBench):
        def turn(self, name: str, value: float) -> None:
            turned.append((name, value))

    BenchHand(Turning())(Ask(Action.TURN, "up"))
    assert turned == [("knob", 0.0)]
