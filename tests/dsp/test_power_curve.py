"""Where a curve passes a THD+N, what it leaves uncertain, and which readings belong to the control and not to it."""

import math

import attrs
import numpy as np
import pytest

from tests.dsp.clippers import hard, read_at
from wattproof.core.notes import Kind, note
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Span
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.dsp.power_curve import (
    Crossing,
    Dominated,
    LeftOut,
    Point,
    crossing_of,
    curve_of,
    left_out,
    point_of,
)


def point(volts: float, thdn: float, at_s: float = 0.0, *, moved_db: float = 0.0, stroke: int = 0) -> Point:
    return Point(volts, thdn, 1e-4 * thdn, thdn, 0.1 * thdn, moved_db, at_s, 0.02, stroke)


def sampled(step_db: float, offset: float = 0.0, stroke: int = 0, factor: float = 1.0) -> list[Point]:
    """Return readings of an ideal hard clipper by steps of the drive, volts times a factor."""
    drives = 10.0 ** (np.arange(-6.0 + offset * step_db, 3.0, step_db) / 20.0)
    read = [read_at(hard, float(drive), 1e-4) for drive in drives]
    return [point(volts * factor, thdn, index * 0.02, stroke=stroke) for index, (volts, thdn) in enumerate(read)]


def true_vrms(thdn: float) -> float:
    low, high = 1.0, 3.0
    for _ in range(50):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if read_at(hard, middle, 1e-4)[1] < thdn else (low, middle)
    return read_at(hard, low, 1e-4)[0]


def found(points: list[Point], thdn: float) -> Crossing:
    crossing = crossing_of(points, thdn)
    assert crossing is not None
    return crossing


@pytest.mark.parametrize("thdn", [0.01, 0.03, 0.10])
@pytest.mark.parametrize("offset", [0.0, 0.25, 0.5, 0.75])
def test_a_crossing_between_readings_is_within_its_uncertainty(thdn: float, offset: float) -> None:
    crossing = found(sampled(0.15, offset), thdn)
    missed = crossing.voltage_vrms / true_vrms(thdn) - 1.0
    assert abs(missed) * DB_PER_RELATIVE < 0.004
    assert abs(missed) < 3.0 * crossing.u_vrms / crossing.voltage_vrms + 1e-6


def test_the_highest_crossing_counts_where_noise_crosses_too() -> None:
    low = [point(0.001 * 1.5**k, 0.05 / 1.5**k, k * 0.02) for k in range(6)]
    assert found(low + sampled(0.15), 0.01).voltage_vrms == pytest.approx(true_vrms(0.01), rel=1e-3, abs=0.0)


def test_a_value_that_is_not_reached_has_no_crossing() -> None:
    assert crossing_of(sampled(0.15), 0.5) is None
    assert crossing_of([], 0.01) is None


def test_half_the_difference_of_two_strokes_enters_the_uncertainty() -> None:
    both = sampled(0.15) + sampled(0.15, 0.4, stroke=1, factor=1.01)
    crossing = found(both, 0.01)
    assert crossing.voltage_vrms == pytest.approx(1.005 * true_vrms(0.01), rel=5e-4, abs=0.0)
    assert crossing.u_vrms == pytest.approx(0.005 * true_vrms(0.01), rel=0.1, abs=0.0)


def test_the_averaging_of_a_moving_block_is_put_back_and_left_in_doubt() -> None:
    still = found(sampled(0.15), 0.01)
    moving = found([attrs.evolve(each, moved_db=0.12) for each in sampled(0.15)], 0.01)
    raised_db = db(moving.voltage_vrms / still.voltage_vrms)
    assert 0.002 < raised_db < 0.02
    assert moving.u_vrms > still.u_vrms
    assert raised_db < 3.0 * DB_PER_RELATIVE * moving.u_vrms / moving.voltage_vrms


def test_averaging_a_clipping_block_moves_the_crossing_by_what_is_allowed_for() -> None:
    # a block averages the residual's power over its way: computed here on the ideal clipper itself
    step_db, span_db = 0.15, 0.15
    points = []
    for centre in np.arange(-1.0, 2.0, step_db):
        drives = 10.0 ** ((centre + span_db * (np.arange(21) / 20.0 - 0.5)) / 20.0)
        volts, thdn = np.array([read_at(hard, float(drive), 1e-4) for drive in drives]).T
        level = float(np.sqrt((volts**2).mean()))
        residual = float(np.sqrt(((volts * thdn) ** 2).mean()))
        points.append(point(level, residual / level, float(centre), moved_db=float(db(volts[-1] / volts[0]))))
    crossing = found(points, 0.01)
    missed = abs(crossing.voltage_vrms / true_vrms(0.01) - 1.0)
    assert missed < 2.0 * crossing.u_vrms / crossing.voltage_vrms


def turned(count: int = 60, db_per_point: float = 0.15) -> list[Point]:
    volts = 0.1 * 10.0 ** (np.arange(count) * db_per_point / 20.0)
    noise = 3e-5 / volts
    return [
        point(float(v), float(n), k * 0.025, moved_db=0.15) for k, (v, n) in enumerate(zip(volts, noise, strict=True))
    ]


def test_a_steady_hand_leaves_nothing_out() -> None:
    assert left_out(turned()) == {}
    assert left_out(sampled(0.15)) == {}


def test_a_crackle_and_a_drop_out_are_told_from_the_curve() -> None:
    points = turned()
    points[20] = attrs.evolve(points[20], thdn=5.0 * points[20].thdn)
    points[40] = attrs.evolve(points[40], voltage_vrms=0.3 * points[40].voltage_vrms)
    assert left_out(points) == {20: LeftOut.CRACKLE, 40: LeftOut.JUMP}


def test_strokes_are_judged_each_by_itself() -> None:
    up = sampled(0.15)
    down = [attrs.evolve(each, stroke=1, start_s=10.0 + k * 0.02) for k, each in enumerate(reversed(up))]
    assert left_out(up + down) == {}


def test_equal_voltages_become_one_point() -> None:
    curve = curve_of([point(1.0, 0.03), point(1.0, 0.04), point(0.5, 0.02)])
    np.testing.assert_allclose(curve.voltage_vrms, [0.5, 1.0], rtol=1e-12, atol=0.0)
    np.testing.assert_allclose(curve.thdn, [0.02, math.sqrt((0.03**2 + 0.04**2) / 2.0)], rtol=1e-12, atol=0.0)


@pytest.mark.parametrize(
    ("thd", "noise", "said"),
    [(0.01, 0.001, Dominated.HARMONICS), (0.001, 0.01, Dominated.NOISE), (0.01, 0.01, Dominated.BOTH)],
)
def test_what_thdn_is_made_of_is_told(thd: float, noise: float, said: Dominated) -> None:
    assert attrs.evolve(point(1.0, math.hypot(thd, noise)), thd=thd, noise=noise).dominated is said


def read(state: State = State.OK, volts: float | None = 2.0, thdn: float | None = 0.02) -> Reading:
    level = None if volts is None else Quantity(volts, "V")
    ratio = None if thdn is None else measured(thdn, 1e-5, "1")
    moved = note(Kind.LEVEL_MOVES, db=0.12, db_per_s=6.0)
    return Reading(
        span=Span(96_000, 1920, 96_000.0),
        channel=1,
        settings=ReadingSettings(),
        state=state,
        notes=(moved,),
        level_vrms=level,
        thdn=ratio,
        thd=measured(0.016, 1e-5, "1"),
        noise=measured(0.012, 1e-5, "1"),
    )


def test_a_reading_becomes_a_point() -> None:
    made = point_of(read(), stroke=1)
    assert made is not None
    assert (made.voltage_vrms, made.thdn, made.moved_db, made.stroke) == (2.0, 0.02, 0.12, 1)
    assert made.residual_vrms == pytest.approx(0.04, rel=1e-12, abs=0.0)
    assert made.start_s == 1.0


@pytest.mark.parametrize("reading", [read(State.UNSTEADY), read(volts=None), read(thdn=None), read(volts=0.0)])
def test_what_could_not_be_read_is_no_point(reading: Reading) -> None:
    assert point_of(reading) is None
