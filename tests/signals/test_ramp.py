"""A ramp rises smoothly from above nothing to exactly one."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from wattproof.signals.ramp import RAMP_S, raised_cosine

_FRAMES = st.integers(1, 20_000)


@given(_FRAMES)
def test_it_rises_all_the_way_and_ends_at_exactly_one(frames: int) -> None:
    ramp = raised_cosine(frames)
    assert ramp.shape == (frames,)
    assert ramp[-1] == 1.0
    assert ramp[0] > 0.0
    assert np.all(np.diff(ramp) >= 0.0)


@given(_FRAMES.filter(lambda frames: frames > 1))
def test_it_is_symmetric_so_that_a_fall_and_a_rise_add_to_one(frames: int) -> None:
    rise = np.concatenate([[0.0], raised_cosine(frames)])
    assert_allclose(rise + rise[::-1], 1.0, rtol=0.0, atol=4e-16)  # closed form: cos(π − x) = −cos x; two roundings


@given(_FRAMES)
def test_no_step_is_larger_than_the_slope_of_a_half_cosine(frames: int) -> None:
    rise = np.concatenate([[0.0], raised_cosine(frames)])
    # closed form: the derivative of (1 − cos πx)/2 is at most π/2
    assert np.max(np.diff(rise)) <= np.pi / 2 / frames + 1e-15


def test_a_ramp_is_over_well_before_a_mute_must_be() -> None:
    assert 0.005 <= RAMP_S <= 0.020  # common practice, no source: 5 to 20 ms
