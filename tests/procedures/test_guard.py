"""What the guard reckons with: heat that follows its closed form, presence, falls, bursts and the first power-up."""

import math

import pytest

from wattproof.core.units import db
from wattproof.procedures.guard import (
    BURST_DUTY,
    COOLING_S,
    FALL_DB,
    FIRST_POWER_UP,
    PRESENCE_S,
    PRESENCE_WARNING_S,
    UNMOUNTED_SHARE,
    Heat,
    Presence,
    fell,
    mounted_w,
    parts_burnt,
    pause_s,
)


def test_heat_follows_one_time_constant() -> None:
    heat = Heat("the load", 50.0)
    heat.spend(50.0, COOLING_S)
    assert heat.share == pytest.approx(1.0 - math.exp(-1.0), rel=1e-12, abs=0.0)  # closed form, first order
    heat.spend(0.0, COOLING_S)
    assert heat.share == pytest.approx((1.0 - math.exp(-1.0)) * math.exp(-1.0), rel=1e-12, abs=0.0)


def test_many_short_spells_are_as_one_long_one() -> None:
    one, many = Heat("the load", 50.0), Heat("the load", 50.0)
    one.spend(80.0, 30.0)
    for _ in range(300):
        many.spend(80.0, 0.1)
    assert many.share == pytest.approx(one.share, rel=1e-12, abs=0.0)


@pytest.mark.parametrize("power_w", [60.0, 100.0, 1000.0])
def test_the_time_left_ends_at_the_rating(power_w: float) -> None:
    heat = Heat("the load", 50.0)
    heat.spend(20.0, 15.0)
    heat.spend(power_w, heat.left_s(power_w))
    assert heat.share == pytest.approx(1.0, rel=1e-12, abs=0.0)
    assert heat.left_s(power_w) == pytest.approx(0.0, rel=0.0, abs=1e-9)


def test_a_power_below_the_rating_may_stay_for_good() -> None:
    heat = Heat("the load", 50.0)
    assert math.isinf(heat.left_s(49.0))
    heat.spend(49.0, 1e6)
    assert heat.share < 1.0
    assert heat.over_s == 0.0


def test_time_above_the_rating_is_counted() -> None:
    heat = Heat("the load", 50.0)
    heat.spend(60.0, 2.0)
    heat.spend(40.0, 5.0)
    heat.spend(51.0, 1.5)
    assert heat.over_s == pytest.approx(3.5, rel=1e-12, abs=0.0)


def test_a_rating_must_be_above_zero() -> None:
    with pytest.raises(ValueError, match="rated_w"):
        Heat("the load", 0.0)


def test_printed_watts_count_a_third_without_the_stated_heat_sink() -> None:
    assert mounted_w(None, 100.0, heat_sink=False) == pytest.approx(100.0 * UNMOUNTED_SHARE, rel=1e-12, abs=0.0)
    assert mounted_w(None, 100.0, heat_sink=True) == 100.0
    assert mounted_w(40.0, 100.0, heat_sink=False) == 40.0  # what is stated as mounted stands
    assert mounted_w(None, None, heat_sink=True) is None


def test_presence_is_asked_once_in_time_and_missed_after_two_minutes() -> None:
    presence = Presence()
    presence.pass_time(PRESENCE_S - PRESENCE_WARNING_S - 1.0, warm=True, said=0)
    assert not presence.due
    presence.pass_time(2.0, warm=True, said=0)
    assert presence.due
    presence.asked = True
    assert not presence.due
    presence.pass_time(PRESENCE_WARNING_S, warm=True, said=0)
    assert presence.missed


def test_an_answer_or_cold_parts_begin_the_time_anew() -> None:
    presence = Presence()
    presence.pass_time(100.0, warm=True, said=0)
    presence.pass_time(1.0, warm=True, said=1)
    assert presence.since_s == 0.0
    presence.pass_time(100.0, warm=True, said=1)
    presence.pass_time(1.0, warm=False, said=1)
    assert presence.since_s == 0.0
    assert not presence.missed


def test_a_fall_is_told_from_what_the_drive_explains() -> None:
    assert fell(10.0, 1.0, 9.0) == 0.0
    assert fell(10.0, 0.1, 1.0) == 0.0  # the drive went down by 20 dB
    assert fell(10.0, 2.0, 10.0) == 0.0  # clipping: more drive, no more output
    assert fell(10.0, 1.0, 1.0) == pytest.approx(20.0, rel=1e-12, abs=0.0)
    just = 10.0 ** (-FALL_DB / 20.0) * 10.0
    assert fell(10.0, 1.0, just * 1.001) == 0.0
    assert fell(10.0, 1.0, just * 0.999) == pytest.approx(-db(0.0999 * just), rel=1e-9, abs=1e-9)


def test_bursts_keep_their_duty() -> None:
    assert 0.35 / (0.35 + pause_s(0.35)) == pytest.approx(BURST_DUTY, rel=1e-12, abs=0.0)


def test_the_guard_names_what_burns_and_the_first_power_up_its_dangers() -> None:
    assert "Zobel" in parts_burnt(10_000.0)
    assert "transformer" in parts_burnt(30.0)
    page = " ".join(FIRST_POWER_UP)
    assert all(
        word in page for word in ("current-limited", "lamp", "DC offset", "loudspeaker", "headphones", "licensed")
    )
