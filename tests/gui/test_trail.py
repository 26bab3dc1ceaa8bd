"""The trail that the hand draws: strokes, lifted pens, bounded memory."""

import math

import attrs

from tests.gui.fake_runner import FakeRunner
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading, State
from wattproof.gui.trail import Axis, Trail


def reading(power_w: float, thdn: float, load_ohm: float | None = 8.0) -> Reading:
    shown, _ = FakeRunner().read()
    settings = attrs.evolve(shown.settings, load_ohm=load_ohm)
    power = Quantity(power_w, "W")
    return attrs.evolve(shown, settings=settings, power_w=power, thdn=Quantity(thdn, "1"))


def test_points_follow_the_readings_in_order() -> None:
    trail = Trail()
    for power, thdn in ((1.0, 0.001), (2.0, 0.0005), (1.5, 0.0007)):
        trail.take(reading(power, thdn), 997.0)
    assert trail.current is not None
    assert trail.current.key.axis is Axis.POWER
    assert trail.current.since(0) == [(1.0, 0.001), (2.0, 0.0005), (1.5, 0.0007)]
    assert trail.now == (1.5, 0.0007)


def test_a_hand_at_rest_adds_no_points() -> None:
    trail = Trail()
    for _ in range(100):
        trail.take(reading(1.0, 0.001), 997.0)
    assert trail.current is not None
    assert len(trail.current.x) == 1


def test_a_refused_reading_lifts_the_pen() -> None:
    trail = Trail()
    trail.take(reading(1.0, 0.001), 997.0)
    refused = attrs.evolve(reading(2.0, 0.001), state=State.UNSTEADY)
    trail.take(refused, 997.0)
    trail.take(refused, 997.0)
    assert trail.now is None
    trail.take(reading(3.0, 0.001), 997.0)
    assert trail.current is not None
    assert [math.isnan(x) for x in trail.current.x] == [False, True, False]


def test_another_load_or_frequency_begins_a_new_stroke_and_keeps_the_last() -> None:
    trail = Trail()
    for power in (1.0, 2.0):
        trail.take(reading(power, 0.001), 997.0)
    trail.take(reading(2.0, 0.002, load_ohm=4.0), 997.0)
    assert trail.current is not None
    assert trail.earlier is not None
    assert trail.current.since(0) == [(2.0, 0.002)]
    assert trail.earlier.since(0) == [(1.0, 0.001), (2.0, 0.001)]
    trail.take(reading(2.0, 0.002, load_ohm=4.0), 6300.0)
    assert trail.current.key.frequency_hz == 6300.0


def test_without_a_load_the_trail_runs_over_volts() -> None:
    trail = Trail()
    trail.take(reading(1e-5, 0.001, load_ohm=1e6), 997.0)
    assert trail.current is not None
    assert trail.current.key.axis is Axis.VOLTS


def test_a_stroke_is_bounded_in_memory() -> None:
    trail = Trail()
    one = reading(1.0, 0.001)
    for index in range(9000):
        power = Quantity(1.0 + 0.5 * (index % 2), "W")
        trail.take(attrs.evolve(one, power_w=power), 997.0)
    assert trail.current is not None
    assert len(trail.current.x) == len(trail.current.y) <= 4001
