"""A figure opened: its sources, the largest first, in the unit in which it is shown."""

import math

import pytest

from wattproof.core.quantity import Part, Quantity
from wattproof.gui.budget import lines_of, words_of


def test_sources_come_by_their_share_of_the_variance() -> None:
    power = Quantity(10.0, "W", (Part("statistics", 0.03), Part("load", -0.04)))
    lines = lines_of(power)
    assert [line.source for line in lines] == ["load", "statistics"]
    assert [line.share for line in lines] == pytest.approx([0.64, 0.36], rel=1e-9, abs=0)  # (4/5)², (3/5)²: closed form
    assert lines[0].u == "0.040 W"


def test_a_ratio_is_opened_in_per_cent_and_a_limit_is_called_one() -> None:
    thdn = Quantity(4e-5, "1", (Part("statistics", 1e-6, 9.0),), limited_by="interface")
    words = words_of("THD+N", thdn)
    assert "0.00010 %" in words
    assert "2.26" in words  # Student, 9 degrees of freedom (JCGM 100:2008, table G.2)
    assert "A limit, not a measurement" in words


def test_what_carries_no_doubt_has_no_lines() -> None:
    assert lines_of(Quantity(8.0, "Ω")) == ()
    assert math.isinf(Quantity(8.0, "Ω").dof)
