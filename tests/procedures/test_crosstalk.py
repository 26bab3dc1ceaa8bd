"""Crosstalk both ways: a path between the simulated channels is read selectively, and what noise hides is a limit."""

import pytest

from tests.procedures.sitting import done, result
from wattproof.bench.simulated.truth import crosstalk
from wattproof.core.notes import Kind
from wattproof.core.units import db
from wattproof.procedures.crosstalk import CrosstalkPlan


@pytest.mark.parametrize("way", [0, 1])
def test_each_way_is_the_closed_form_of_the_path(way: int) -> None:
    told = done("crosstalk").ways[way]
    assert (told.driven.channel, told.into.channel) == ((1, 2), (2, 1))[way]
    for point in told.points:
        truth = abs(crosstalk(-70.0, point.frequency_hz, back=way == 1))
        assert point.ratio.limited_by is None
        assert abs(point.ratio.value - truth) < 3.0 * point.ratio.u + 1e-4 * truth
        assert db(point.ratio.value / truth) == pytest.approx(0.0, rel=0.0, abs=0.1)


def test_channels_that_are_apart_get_a_limit_from_the_noise() -> None:
    told = result(CrosstalkPlan(from_hz=1_000.0, to_hz=2_000.0, per_octave=0.5, read_s=0.25)).ways[0]
    hidden = [point for point in told.points if point.ratio.limited_by == "noise"]
    assert hidden
    assert all(db(point.ratio.value) < -100.0 for point in hidden)
    assert Kind.CROSSTALK_LIMIT in {note.kind for note in told.notes}


def test_the_caveats_of_ground_and_interface_are_said() -> None:
    told = {note.kind for way in done("crosstalk").ways for note in way.notes}
    assert {Kind.SHARED_GROUND, Kind.CROSSTALK_OWN_UNKNOWN, Kind.UNDRIVEN_TERMINATED} <= told


def test_one_channel_has_no_crosstalk() -> None:
    with pytest.raises(ValueError, match="crosstalk needs two"):
        CrosstalkPlan(channels="1")
