"""Kept readings on the trail: strokes apart, steps in order, what was left out as crosses."""

from tests.gui.fake_runner import FakeRunner
from wattproof.core.reading import Reading
from wattproof.gui.strokes import draw_kept, leave_out
from wattproof.gui.trail import Trail
from wattproof.procedures.requests import Kept, Mark, Role
from wattproof.procedures.statement import CurveReading


def reading_at(knob: float) -> Reading:
    runner = FakeRunner()
    runner.bench.turn("knob", knob)
    return runner.read()[0]


def draw(trail: Trail, knob: float, mark: Mark) -> None:
    draw_kept(trail, Kept(reading_at(knob), mark), 997.0)


def test_the_stroke_up_stays_beside_the_one_down() -> None:
    trail = Trail()
    for knob in (20.0, 30.0, 40.0):
        draw(trail, knob, Mark(Role.STROKE))
    draw(trail, 40.0, Mark(Role.STROKE, stroke=1))
    draw(trail, 30.0, Mark(Role.STROKE, stroke=1))
    assert [len(stroke.x) for stroke in trail.beside] == [3]
    assert trail.current is not None
    assert trail.current.x[0] > trail.current.x[1]
    draw(trail, 20.0, Mark(Role.STROKE, row=1))
    assert not trail.beside
    assert trail.earlier is not None


def test_steps_are_drawn_in_the_order_of_their_level() -> None:
    trail = Trail()
    for knob in (20.0, 40.0, 30.0):
        draw(trail, knob, Mark(Role.STEP))
    assert trail.current is not None
    assert trail.current.dotted
    assert trail.current.x == sorted(trail.current.x)


def test_what_is_only_held_or_checked_is_no_stroke() -> None:
    trail = Trail()
    draw(trail, 20.0, Mark(Role.HELD, at="1 %"))
    draw(trail, 20.0, Mark(Role.CHECK))
    assert trail.current is None


def test_left_out_readings_become_crosses_and_leave_a_hole() -> None:
    trail = Trail()
    mark = Mark(Role.STROKE)
    for knob in (20.0, 30.0, 40.0):
        draw(trail, knob, mark)
    curve = [
        CurveReading(0, mark, reading_at(knob), None, "jump" if knob == 30.0 else "") for knob in (20.0, 30.0, 40.0)
    ]
    leave_out(trail, curve, 0)
    assert len(trail.left_out) == 1
    assert trail.current is not None
    assert trail.current.x[1] != trail.current.x[1]  # NaN
