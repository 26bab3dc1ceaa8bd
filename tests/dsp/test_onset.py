"""Onset of clipping by the project's definition: near geometric clipping for hard clippers, never for gradual ones."""

import numpy as np
import pytest

from tests.dsp.clippers import GEOMETRIC_VRMS, Curving, crossed_over, curve_through, hard, read_at
from wattproof.core.signal import Samples
from wattproof.core.units import db
from wattproof.dsp.onset import Curve, NoOnset, Onset, find_onset, step_db, trend_at


def missed_db(curve: Curve) -> float:
    """Return by how much the onset is above geometric clipping, in dB."""
    onset = find_onset(curve)
    assert isinstance(onset, Onset), onset
    return db(onset.voltage_vrms / GEOMETRIC_VRMS)


def bent(second: float, third: float) -> Curving:
    def curve(wave: Samples) -> Samples:
        flat = hard(wave)
        return flat * (1.0 + flat * (second + third * flat))

    return curve


@pytest.mark.parametrize("noise_vrms", [1e-5, 1e-4, 7e-4])  # THD+N at clipping from 0.0014 % to 0.1 %
@pytest.mark.parametrize("step", [0.05, 0.25])
def test_hard_clipping_is_found_where_it_begins(noise_vrms: float, step: float) -> None:
    # the project's own bounds for unclipped THD+N up to 0.1 %
    assert -0.03 < missed_db(curve_through(hard, noise_vrms=noise_vrms, step_db=step)) < 0.10


@pytest.mark.parametrize("second", [0.0, 0.0008, 0.0019])
@pytest.mark.parametrize("third", [0.0, -0.0010, 0.0012])
def test_a_little_curvature_before_it_moves_it_little(second: float, third: float) -> None:
    curving = bent(second, third)
    if read_at(curving, 0.99)[1] <= 0.001:
        assert -0.03 < missed_db(curve_through(curving, noise_vrms=3e-5)) < 0.10


@pytest.mark.parametrize("seed", range(5))
def test_scattered_readings_find_it_too(seed: int) -> None:
    assert -0.03 < missed_db(curve_through(hard, scatter=0.03, seed=seed)) < 0.10


def test_one_per_cent_of_other_distortion_hides_it_by_a_third_of_a_decibel_at_most() -> None:
    # a residual that adds in power, as crossover of changing phase does: 1 % of the voltage at clipping, at every level
    assert 0.0 < missed_db(curve_through(hard, noise_vrms=0.01 * GEOMETRIC_VRMS, to_db=5.0)) < 0.35


@pytest.mark.parametrize("width", [0.0, 0.05, 0.3])
def test_one_per_cent_of_crossover_hides_it_by_somewhat_more(width: float) -> None:
    """The third harmonics of crossover and of clipping are opposite and cancel at first, so that the rise comes later.

    The bound of 0.6 dB is our own measurement, of a dead zone and of smooth steps alike.
    """
    step = {0.0: 0.0162, 0.05: 0.0181, 0.3: 0.0324}[width]  # each makes 1 % where clipping begins

    def curving(wave: Samples) -> Samples:
        flat = hard(wave)
        return crossed_over(wave, step) if width == 0.0 else flat - step * flat / np.sqrt(flat**2 + width**2)

    clips_vrms, thdn = read_at(curving, 1.0162 if width == 0.0 else 1.0)
    assert thdn == pytest.approx(0.01, rel=0.07, abs=0.0)
    onset = find_onset(curve_through(curving, to_db=5.0))
    assert isinstance(onset, Onset)
    assert 0.0 < db(onset.voltage_vrms / clips_vrms) < 0.60


@pytest.mark.parametrize("sharpness", [0.3, 0.5, 1.0, 2.0])
@pytest.mark.parametrize("noise_vrms", [1e-5, 1e-4, 1e-3])
def test_a_soft_amplifier_has_no_distinct_onset(sharpness: float, noise_vrms: float) -> None:
    def curving(wave: Samples) -> Samples:
        return np.tanh(wave * sharpness) / sharpness

    assert find_onset(curve_through(curving, to_db=16.0, noise_vrms=noise_vrms)) is NoOnset.GRADUAL


@pytest.mark.parametrize("second", [0.001, 0.01, 0.1])
def test_a_second_harmonic_alone_never_has_one(second: float) -> None:
    def curving(wave: Samples) -> Samples:
        return wave + second * wave * wave

    assert isinstance(find_onset(curve_through(curving, to_db=10.0)), NoOnset)


def test_a_record_that_begins_near_it_is_asked_to_begin_lower() -> None:
    assert find_onset(curve_through(hard, from_db=-15.0)) is NoOnset.BEGIN_LOWER


def test_a_record_that_ends_below_it_has_not_reached_it() -> None:
    assert find_onset(curve_through(hard, to_db=-3.0)) is NoOnset.NOT_REACHED


def test_the_onset_says_how_well_it_is_known() -> None:
    coarse, fine = (find_onset(curve_through(hard, step_db=step)) for step in (0.25, 0.05))
    assert isinstance(coarse, Onset)
    assert isinstance(fine, Onset)
    assert fine.u_vrms < coarse.u_vrms
    assert step_db(coarse) > 3.0 * step_db(fine)
    assert coarse.below_vrms < coarse.voltage_vrms < coarse.above_vrms


@pytest.mark.parametrize("coefficients", [(1e-8, 0.0, 0.0, 0.0), (0.0, 3e-6, 0.0, 2e-7), (1e-9, 0.0, 4e-5, 0.0)])
def test_the_trend_of_what_follows_the_law_is_that_law(coefficients: tuple[float, ...]) -> None:
    volts = np.geomspace(0.05, 2.0, 60)
    square = sum(c * volts ** (2 * power) for power, c in enumerate(coefficients))
    expected = sum(c * 1.7 ** (2 * power) for power, c in enumerate(coefficients)) ** 0.5
    assert trend_at(1.7, volts, np.sqrt(square)) == pytest.approx(expected, rel=1e-5, abs=0.0)


def test_the_trend_never_falls_below_what_no_negative_term_can_give() -> None:
    volts = np.geomspace(0.05, 2.0, 60)
    falling = 1e-3 / volts  # no sum of non-negative powers falls: the best of them is a constant
    trend = trend_at(2.0, volts, falling)
    assert trend is not None
    assert trend >= falling.min()


def test_too_few_readings_have_no_trend() -> None:
    volts = np.array([0.1, 0.2, 0.3, 0.9])
    assert trend_at(1.0, volts, 1e-3 * volts) is None


@pytest.mark.parametrize(
    ("volts", "thdn"),
    [([1.0, 1.0], [0.1, 0.2]), ([2.0, 1.0], [0.1, 0.2]), ([0.0, 1.0], [0.1, 0.2]), ([1.0, 2.0], [0.0, 0.1])],
)
def test_what_is_no_curve_is_refused(volts: list[float], thdn: list[float]) -> None:
    with pytest.raises(ValueError, match="Curve"):
        Curve(np.array(volts), np.array(thdn), np.array(thdn))
