"""Gain, balance, tracking and polarity of simulated amplifiers with known gains."""

import pytest

from tests.procedures.sitting import done, result
from wattproof.bench.simulated.truth import Truth
from wattproof.core.notes import Kind
from wattproof.core.units import db
from wattproof.procedures.gain import GainPlan


@pytest.mark.parametrize("channel", [1, 2])
def test_the_gain_is_that_of_the_amplifier(channel: int) -> None:
    told = done("gain").channels[channel - 1]
    truth = Truth("class-d-bridge", channel=channel).gain
    assert db(told.at[0].gain.value / truth) == pytest.approx(0.0, rel=0.0, abs=0.005)


def test_the_sensitivity_is_the_rated_output_over_the_gain() -> None:
    left = done("gain").channels[0]
    truth = 8.0 / Truth("class-d-bridge").gain
    assert left.sensitivity_vrms.value == pytest.approx(truth, rel=6e-4, abs=0.0)


def test_tracking_follows_both_channels_along_the_travel() -> None:
    # the knob turns the left channel by 20 and 40 dB; mistracking leaves the right one up by 3 dB on 60
    left, right = done("gain").channels
    assert [db(each.from_first.value) for each in left.at] == pytest.approx([0.0, -20.0, -40.0], rel=0.0, abs=0.02)
    assert [db(each.from_first.value) for each in right.at] == pytest.approx([0.0, -19.0, -38.0], rel=0.0, abs=0.02)


def test_balance_is_the_second_channel_over_the_first() -> None:
    # the channels are made 0.983 alike
    found = {each.position: db(each.ratio.value) for each in done("gain").balance}
    assert found["0"] == pytest.approx(db(0.983), rel=0.0, abs=0.005)
    assert found["-40"] == pytest.approx(db(0.983) + 2.0, rel=0.0, abs=0.02)


def test_an_inverting_amplifier_is_told() -> None:
    told = done("gain")
    assert [channel.inverted for channel in told.channels] == [True, True]
    assert Kind.POLARITY_TURNED in {note.kind for note in told.notes}


def test_a_control_that_works_on_one_side_only_is_pointed_out() -> None:
    told = result(GainPlan(positions="0,-20", polarity=False), {"one-sided": 1.0, "knob": 0.0})
    alone = next(dict(note.values) for note in told.notes if note.kind is Kind.CHANNEL_ALONE)
    assert (alone["what"], alone["named"]) == ("left", "right")
    assert alone["db"] == pytest.approx(20.0, rel=0.0, abs=0.05)
    assert Kind.CHANNELS_DIFFER in {note.kind for note in told.notes}
    assert [channel.inverted for channel in told.channels] == [None, None]
