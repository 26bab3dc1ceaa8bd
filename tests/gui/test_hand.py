"""The hand on the knob: it glides where the bench can let it, and never jumps."""

import attrs
import pytest

from tests.gui.fake_runner import FakeBench
from wattproof.core.errors import WrongUseError
from wattproof.gui.hand import Hand

FRAME_S = 1 / 30


class GlidingBench(FakeBench):
    """A bench whose knob moves steadily once it is told to, as time passes."""

    def __init__(self) -> None:
        super().__init__()
        knob = self.settings["knob"]
        self.settings["knob"] = attrs.evolve(knob, unit="dB", minimum=-60.0, maximum=0.0, value=-20.0)
        self.target, self.per_second = -20.0, 0.0
        self.speeds: list[float] = []

    def glide(self, name: str, target: float, per_second: float) -> None:
        knob = self.settings[name]
        if not knob.minimum <= target <= knob.maximum:
            raise WrongUseError(f"{knob.label} is {target:g}; it must lie within its range")
        if not per_second > 0:
            raise WrongUseError(f"{knob.label} glides by {per_second:g}; it must be more than 0")
        self.target, self.per_second = target, per_second

    def pass_frame(self) -> None:
        knob = self.settings["knob"]
        left = self.target - knob.value
        way = max(-self.per_second * FRAME_S, min(self.per_second * FRAME_S, left))
        self.speeds.append(abs(way) / FRAME_S)
        self.settings["knob"] = attrs.evolve(knob, value=knob.value + way)


def turned(bench: GlidingBench, hand: Hand, seconds: float) -> float:
    for _ in range(round(seconds / FRAME_S)):
        hand.follow()
        bench.pass_frame()
    return bench.settings["knob"].value


def test_the_knob_arrives_without_passing_its_target() -> None:
    bench = GlidingBench()
    hand = Hand(bench)
    hand.turn("knob", -10.0)
    positions = [turned(bench, hand, FRAME_S) for _ in range(120)]
    assert positions == sorted(positions)
    assert positions[-1] == pytest.approx(-10.0, rel=0, abs=1e-9)
    assert max(bench.speeds) <= 20.0 + 1e-9


def test_the_knob_starts_gently() -> None:
    bench = GlidingBench()
    hand = Hand(bench)
    hand.nudge(1)
    turned(bench, hand, 2.0)
    changes = [abs(after - before) for before, after in zip([0.0, *bench.speeds[:-1]], bench.speeds, strict=True)]
    assert max(changes) < 1.0  # dB/s from one frame to the next; a jump would be 0.6 dB · 30/s = 18 dB/s
    assert bench.settings["knob"].value == pytest.approx(-19.4, rel=0, abs=1e-9)


def test_steps_add_up_while_the_knob_is_on_its_way() -> None:
    bench = GlidingBench()
    hand = Hand(bench)
    for _ in range(10):
        hand.nudge(1)
    assert turned(bench, hand, 4.0) == pytest.approx(-14.0, rel=0, abs=1e-9)


def test_the_knob_stays_within_its_range_and_a_wrong_target_is_refused() -> None:
    bench = GlidingBench()
    hand = Hand(bench)
    hand.nudge(1000)
    assert turned(bench, hand, 8.0) == pytest.approx(0.0, rel=0, abs=1e-9)
    hand.nudge(1)  # at its end it stays, and nothing is refused
    with pytest.raises(WrongUseError, match="within its range"):
        hand.turn("knob", 6.0)
    assert turned(bench, hand, 1.0) == pytest.approx(0.0, rel=0, abs=1e-9)


def test_a_bench_that_cannot_glide_is_turned_at_once() -> None:
    bench = FakeBench()
    Hand(bench).turn("knob", 70.0)
    assert bench.settings["knob"].value == 70.0
