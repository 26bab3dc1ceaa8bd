"""The sine fit against signals whose truth is known in closed form."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.dsp.waveforms import capture, db, read_ok, sine, value
from wattproof.core.reading import ReadingSettings, State
from wattproof.dsp.fit import SineFit, block_of, fit_block, fit_trend
from wattproof.dsp.live import LiveReader
from wattproof.dsp.model import Model

RATES_HZ = (44_100.0, 48_000.0, 88_200.0, 96_000.0, 176_400.0, 192_000.0)
anything_audible = st.floats(math.log(20.0), math.log(20_000.0)).map(math.exp)
any_phase = st.floats(-math.pi, math.pi)


def _fitted(samples: np.ndarray, rate_hz: float, start_hz: float, model: Model) -> tuple[SineFit, np.ndarray]:
    block = block_of(samples[:, None])
    fit = fit_block(block, rate_hz, start_hz, model)
    return fit, (block - fit.waveform()).ravel()


def test_a_pure_sine_leaves_nothing_above_minus_250_db() -> None:
    reading = read_ok(sine(96_000, 96_000.0, 997.0), 96_000.0)
    assert db(value(reading.thdn)) < -250.0


def test_a_tone_that_is_followed_leaves_nothing_above_minus_150_db() -> None:
    reader = LiveReader(96_000.0, (ReadingSettings(),))
    frames = 24_000
    for number in range(6):
        first = 4000 * number
        samples = sine(frames, 96_000.0, 997.0, start_frame=first)
        (reading,), _ = reader.take(capture(samples, rate_hz=96_000.0, first_frame=first))
        assert (reading.state, reading.notes) == (State.OK, ())
        assert db(value(reading.thdn)) < -150.0


def test_a_tone_whose_frequency_drifts_is_followed_below_minus_150_db() -> None:
    reader = LiveReader(96_000.0, (ReadingSettings(),))
    for number in range(8):
        hz = 997.0 * (1.0 + 2e-6 * number)  # a warming oscillator: 2 ppm from block to block
        (reading,), _ = reader.take(capture(sine(24_000, 96_000.0, hz), rate_hz=96_000.0))
        assert db(value(reading.thdn)) < -150.0
        assert value(reading.fundamental_hz) == pytest.approx(hz, rel=1e-9, abs=0)


@pytest.mark.parametrize("seconds", [0.1, 1.0])
@pytest.mark.parametrize("ratio_db", [-130.0, -100.0, -60.0])
def test_harmonics_down_to_minus_130_db_read_within_a_hundredth_of_a_db(seconds: float, ratio_db: float) -> None:
    ratio = 10.0 ** (ratio_db / 20.0)
    truth = {2: (ratio, 0.3), 3: (ratio / 2.0, -2.0), 10: (ratio, 3.0), 20: (ratio, -0.5)}
    reading = read_ok(sine(round(96_000 * seconds), 96_000.0, 997.0, harmonics=truth, phase_rad=2.0), 96_000.0)
    by_order = {harmonic.order: harmonic for harmonic in reading.harmonics}
    for order, (height, phase) in truth.items():
        assert db(by_order[order].ratio.value / height) == pytest.approx(0.0, rel=0, abs=0.01)
        assert by_order[order].phase_rad == pytest.approx(phase, rel=0, abs=1e-3)


@settings(max_examples=40)
@given(frequency_hz=anything_audible, phase_rad=any_phase, rate_hz=st.sampled_from(RATES_HZ))
def test_the_result_does_not_depend_on_phase_or_frequency(
    frequency_hz: float, phase_rad: float, rate_hz: float
) -> None:
    frames = round(0.2 * rate_hz)
    ratio = 10.0 ** (-80.0 / 20.0)
    orders = [k for k in (2, 3) if k * frequency_hz <= 20_000.0]
    samples = sine(
        frames, rate_hz, frequency_hz, peak=0.7, phase_rad=phase_rad, harmonics=dict.fromkeys(orders, (ratio, 1.0))
    )
    reading = read_ok(samples, rate_hz)
    assert value(reading.fundamental_hz) == pytest.approx(frequency_hz, rel=1e-9, abs=0)
    assert value(reading.fundamental_fs) == pytest.approx(0.7, rel=1e-8, abs=0)
    if orders:
        expected = ratio * math.sqrt(len(orders))
        assert value(reading.thdn) == pytest.approx(expected, rel=1e-3, abs=0)  # 0.01 dB
        assert value(reading.thd) == pytest.approx(expected, rel=1e-3, abs=0)
    else:
        assert reading.thd is None  # no harmonic lies in the band
        assert db(value(reading.thdn)) < -200.0


@settings(max_examples=40)
@given(frequency_hz=anything_audible, phase_rad=any_phase, rate_hz=st.sampled_from(RATES_HZ), one=st.floats(-0.5, 0.5))
def test_a_start_half_a_bin_off_finds_the_tone(
    frequency_hz: float, phase_rad: float, rate_hz: float, one: float
) -> None:
    frames = round(max(0.1, 6.0 / frequency_hz) * rate_hz)
    samples = sine(frames, rate_hz, frequency_hz, phase_rad=phase_rad)
    start = frequency_hz + one * rate_hz / frames
    fit, left = _fitted(samples, rate_hz, start, Model((1,), 1, 3))
    assert fit.frequency_hz == pytest.approx(frequency_hz, rel=1e-10, abs=0)
    assert db(float(np.sqrt(2.0 * np.mean(left**2)))) < -220.0


def test_strong_harmonics_do_not_pull_the_frequency() -> None:
    # more than 24 orders: the rough passes, which leave most of them out, must not have the last word
    saw = {order: (1.0 / order, 0.0) for order in range(2, 48)}
    fit, left = _fitted(sine(24_000, 96_000.0, 997.0, harmonics=saw), 96_000.0, 997.3, Model(tuple(range(1, 48))))
    assert fit.frequency_hz == pytest.approx(997.0, rel=1e-12, abs=0)
    # the last correction turned the tone by 10⁻⁸ rad at most, so its 47 harmonics k·10⁻⁸/k each: 7·10⁻⁸ at the ends
    assert db(float(np.sqrt(2.0 * np.mean(left**2)))) < -143.0


@pytest.mark.parametrize("ramp", [1, 2, 3])
@pytest.mark.parametrize("trend", [1, 3])
def test_what_lies_in_the_model_is_taken_out_whole(ramp: int, trend: int) -> None:
    frames, rate_hz = 9600, 96_000.0
    grid = block_of(np.zeros((frames, 1))).size
    tau = (np.arange(grid) - (grid - 1) / 2.0) * (2.0 / grid)
    level = np.asarray(1.0 + sum(0.1 * tau**power for power in range(1, ramp + 1)), dtype=np.float64)
    drift = sum(0.05 * tau**power for power in range(trend + 1))
    samples = sine(grid, rate_hz, 997.0, peak=level, phase_rad=1.0) + drift
    fit, left = _fitted(samples, rate_hz, 997.01, Model((1,), ramp, trend))
    # a last correction of 10⁻⁸ rad at most turns the part that ramps, a tenth of the tone: 10⁻⁹, and less in the mean
    assert db(float(np.sqrt(2.0 * np.mean(left**2)))) < -190.0
    expected = sum(0.05 / (power + 1) for power in range(0, trend + 1, 2))
    assert fit.dc[0] == pytest.approx(expected, rel=1e-9, abs=0)
    assert fit.relative_slope(0) == pytest.approx(0.1 * 2.0 * rate_hz / grid, rel=1e-6, abs=0)


@pytest.mark.parametrize("cycles", [3.0, 3.5, 4.2])
def test_three_cycles_are_enough(cycles: float) -> None:
    rate_hz, frequency_hz = 48_000.0, 40.0
    frames = math.ceil(cycles * 1.02 * rate_hz / frequency_hz)
    samples = sine(frames, rate_hz, frequency_hz, harmonics={2: (0.01, 0.5), 3: (0.003, 1.0)})
    fit, left = _fitted(samples, rate_hz, frequency_hz * 1.03, Model((1, 2, 3), 1, 1))
    assert fit.frequency_hz == pytest.approx(frequency_hz, rel=1e-9, abs=0)
    assert db(float(np.sqrt(2.0 * np.mean(left**2)))) < -160.0


def test_both_channels_share_one_frequency_and_keep_their_own_amplitudes() -> None:
    left = sine(9600, 96_000.0, 997.0, peak=0.8, phase_rad=0.1)
    right = sine(9600, 96_000.0, 997.0, peak=0.001, phase_rad=-2.0)
    block = block_of(np.stack([left, right], axis=1))
    fit = fit_block(block, 96_000.0, 997.2, Model((1, 2), 1, 3))
    np.testing.assert_allclose(np.abs(fit.coefficients[:, 0]), [0.8, 0.001], rtol=1e-9, atol=0)
    between = np.angle(fit.coefficients[1, 0] / fit.coefficients[0, 0])
    assert between == pytest.approx(-2.1, rel=0, abs=1e-9)


def test_the_parts_of_a_fit_add_up_to_the_whole() -> None:
    samples = sine(9600, 96_000.0, 997.0, harmonics={2: (0.1, 0.0)}) + 0.2
    fit, _ = _fitted(samples, 96_000.0, 997.0, Model((1, 2), 1, 3))
    parts = [fit.waveform(trend=which == 0, first=which == 1, others=which == 2) for which in range(3)]
    np.testing.assert_allclose(sum(parts), fit.waveform(), rtol=0, atol=1e-12)
    np.testing.assert_allclose(parts[0], 0.2, rtol=0, atol=1e-9)
    assert np.ptp(parts[2]) == pytest.approx(0.2, rel=1e-3, abs=0)


def test_a_trend_alone_is_fitted_where_there_is_no_tone() -> None:
    block = block_of(np.linspace(-1.0, 3.0, 9600)[:, None])
    fit = fit_trend(block, 96_000.0)
    np.testing.assert_allclose(block - fit.waveform(), 0.0, rtol=0, atol=1e-10)
    assert fit.coefficients.shape == (1, 0)


def test_a_fit_that_leaves_the_range_says_so() -> None:
    block = block_of(sine(4800, 48_000.0, 2.0, phase_rad=0.3)[:, None])  # a fifth of a cycle: nothing to converge to
    model = Model((1,), 1, 1)
    ends = []
    for start_hz in np.linspace(1.0, 30.0, 30):
        try:
            fit_block(block, 48_000.0, float(start_hz), model)
        except ValueError as error:
            ends.append(str(error))
    assert ends
    assert all("start nearer to the tone" in end for end in ends)


def test_a_block_of_a_few_frames_is_refused() -> None:
    with pytest.raises(ValueError, match="at least 16"):
        block_of(np.zeros((15, 1)))
