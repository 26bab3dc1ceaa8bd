"""Where the window's parts stand at every size: nothing overlaps, nothing hangs out."""

import itertools

import attrs
import pytest

from wattproof.gui.plan import Box, plan_for

SIZES = [(1024, 640), (1280, 720), (1366, 768), (1600, 900), (1920, 1080), (1280, 1024), (2560, 1440), (3840, 2160)]


def boxes(width: int, height: int) -> dict[str, Box]:
    plan = plan_for(width, height)
    return {name: box for name, box in attrs.asdict(plan).items() if isinstance(box, tuple) and box[3] > 0}


def overlap(one: Box, other: Box) -> int:
    wide = min(one[0] + one[2], other[0] + other[2]) - max(one[0], other[0])
    high = min(one[1] + one[3], other[1] + other[3]) - max(one[1], other[1])
    return max(0, wide) * max(0, high)


@pytest.mark.parametrize(("width", "height"), SIZES)
def test_no_two_parts_overlap(width: int, height: int) -> None:
    placed = boxes(width, height)
    del placed["sheet"]  # it takes the place of reading and plots
    for one, other in itertools.combinations(placed, 2):
        assert overlap(placed[one], placed[other]) == 0, f"{one} and {other}"


@pytest.mark.parametrize(("width", "height"), SIZES)
def test_every_part_is_inside_and_has_room(width: int, height: int) -> None:
    for name, (left, top, wide, high) in boxes(width, height).items():
        assert left >= 0, name
        assert top >= 0, name
        assert left + wide <= width, name
        assert top + high <= height, name
        assert wide >= 100, name


def test_small_windows_drop_context_and_keep_the_reading() -> None:
    small, large = plan_for(1024, 640), plan_for(1920, 1080)
    assert small.compact
    assert not large.compact
    assert small.foot[3] == 0
    assert small.thdn[3] >= 80
    assert small.trail[2] * small.trail[3] > small.spectrum[2] * small.spectrum[3]
