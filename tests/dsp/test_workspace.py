"""Arrays that are filled again and again."""

from wattproof.dsp.workspace import Workspace


def test_the_same_array_comes_back_until_its_shape_changes() -> None:
    work = Workspace()
    first = work.array("left", (2, 10))
    assert first.shape == (2, 10)
    assert work.array("left", (2, 10)) is first
    assert work.array("power", (2, 10)) is not first
    other = work.array("left", (2, 11))
    assert other.shape == (2, 11)
    assert work.array("left", (2, 11)) is other
