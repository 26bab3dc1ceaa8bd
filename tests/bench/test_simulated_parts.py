"""The parts of the simulated bench: oscillator, rate changers, clipper, smoother, history and drop-outs."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from wattproof.bench.simulated.clipping import Clipper, clipped
from wattproof.bench.simulated.dropouts import Delivery, DropOut, Fault
from wattproof.bench.simulated.history import History
from wattproof.bench.simulated.interface import LSB, bent, noise_sigma, quantised
from wattproof.bench.simulated.knob import Knob
from wattproof.bench.simulated.oversampling import DELAY_FRAMES, Downsampler, Upsampler
from wattproof.bench.simulated.phase import lines, oscillate
from wattproof.bench.simulated.recursion import Smoother
from wattproof.core.signal import Samples

FRAMES, FACTOR = 256, 8


def test_the_oscillator_is_as_exact_after_a_day_as_at_the_start() -> None:
    rate_hz, day_frames = 96_000.0, 24 * 3600 * 96_000  # a whole number of cycles of 997 Hz
    np.testing.assert_allclose(
        oscillate(997.0, rate_hz, day_frames, 500),
        oscillate(997.0, rate_hz, 0, 500),
        rtol=0.0,
        atol=2e-9,  # the step is rounded to 2^-65 of a cycle: a day of 8.3e9 steps adds up to 2.3e-10 cycles
    )


def test_the_oscillator_joins_itself_however_it_is_cut() -> None:
    whole = oscillate(1234.5, 44_100.0, 0, 1000)
    parts = np.concatenate([oscillate(1234.5, 44_100.0, 0, 333), oscillate(1234.5, 44_100.0, 333, 667)])
    assert np.array_equal(whole, parts)


def test_the_oscillator_is_a_sine() -> None:
    frames = np.arange(2000)
    expected = np.sin(2.0 * np.pi * 997.0 / 48_000.0 * frames)
    np.testing.assert_allclose(
        oscillate(997.0, 48_000.0, 0, 2000), expected, rtol=0.0, atol=1e-12
    )  # rounding of 260 rad


def test_lines_beyond_half_the_rate_are_left_out() -> None:
    assert not lines(((31_000.0, 1.0),), 48_000.0, 0, 100).any()
    assert lines(((31_000.0, 1.0),), 96_000.0, 0, 100).any()


@pytest.mark.parametrize("frequency", [0.01, 0.2, 0.45])
def test_a_sine_passes_up_and_down_unchanged_and_late(frequency: float) -> None:
    up, down = Upsampler(1, FRAMES, FACTOR), Downsampler(1, FRAMES, FACTOR)
    frames = np.arange(8 * FRAMES)
    sine = np.sin(2.0 * np.pi * frequency * frames)[None, :]
    out = np.concatenate([down.push(up.push(part)) for part in np.split(sine, 8, axis=1)], axis=1)
    late = 2 * DELAY_FRAMES
    np.testing.assert_allclose(
        out[0, 1000:], sine[0, 1000 - late : -late], rtol=0.0, atol=1e-5
    )  # two filters, each within 1e-6 (-120 dB) of flat, at 0.45 on the edge of their transition


def test_what_lies_above_half_the_rate_does_not_fold() -> None:
    down = Downsampler(1, FRAMES, FACTOR)
    frames = np.arange(8 * FRAMES * FACTOR)
    sine = np.sin(2.0 * np.pi * 0.70 / FACTOR * frames)[None, :]  # 0.7 of the low rate, would fold to 0.3
    out = np.concatenate([down.push(part) for part in np.split(sine, 8, axis=1)], axis=1)
    assert np.abs(out[0, 1000:]).max() < 1e-5  # Kaiser's formula was asked for 120 dB; the side lobes come close


def test_clipping_is_straight_round_and_flat() -> None:
    wanted = np.array([[0.0, 0.5, 0.9, 1.0, 1.1, 5.0, -1.9, -9.0]])
    expected = np.array([[0.0, 0.5, 0.9, 1.0 - 0.1 / 4, 1.0, 1.0, -1.9 + 0.01 / 0.8, -2.0]])
    # closed form of the parabola: excess²/(4·knee), with knees of 0.1 above and 0.2 below
    np.testing.assert_allclose(clipped(wanted, 1.0, 2.0, 0.1), expected, rtol=0.0, atol=1e-12)


def test_the_clipper_follows_the_static_curve_where_the_wave_is_slow() -> None:
    wanted = 2.0 * np.sin(2.0 * np.pi * np.arange(8192) / 4096)[None, :]
    limit = np.array([[1.0]])
    clipper = Clipper(1, 0.1)
    out = np.concatenate([clipper.push(part, limit, limit) for part in np.split(wanted, 4, axis=1)], axis=1)
    expected = clipped(wanted, 1.0, 1.0, 0.1)
    np.testing.assert_allclose(
        out[0, 100:], expected[0, 100 - Clipper.LATE : -Clipper.LATE], rtol=0.0, atol=2e-5
    )  # a step is 3e-3 at most, and the corner's curvature of 5 makes (3e-3)²·5/2 of difference


def test_the_clipper_keeps_aliases_lower_than_plain_sampling() -> None:
    points, cycles = 8192, 411  # a prime number of cycles: aliases fall between the harmonics
    wanted = 3.0 * np.sin(2.0 * np.pi * cycles / points * np.arange(2 * points))[None, :]
    limit = np.array([[1.0]])
    clipper = Clipper(1, 0.004)
    clipper.push(wanted[:, :points], limit, limit)
    smooth = clipper.push(wanted[:, points:], limit, limit)
    plain = clipped(wanted[:, points:], 1.0, 1.0, 0.004)

    def aliases(wave: Samples) -> float:
        spectrum = np.abs(np.fft.rfft(wave[0])) / points
        spectrum[::cycles] = 0.0
        return float(spectrum[: points // 16].max())  # the part that is kept after lowering the rate by 8

    assert aliases(smooth) < 0.1 * aliases(plain)


def test_the_smoother_is_the_plain_recursion() -> None:
    values = np.random.default_rng(3).standard_normal(300)
    smoother = Smoother(20.0, 100)
    out = np.concatenate([smoother.push(part) for part in np.split(values, 3)])
    decay, state, expected = math.exp(-1.0 / 20.0), 0.0, []
    for value in values.tolist():
        state = decay * state + (1.0 - decay) * value
        expected.append(state)
    np.testing.assert_allclose(out, expected, rtol=0.0, atol=1e-12)  # rounding, scaled by e^5 within a chunk


def test_dither_makes_the_error_of_a_code_triangular_and_white() -> None:
    dice = np.random.default_rng(5)
    error = (quantised(np.full((1, 200_000), 0.3 * LSB), dice) / LSB) - 0.3
    # S. P. Lipshitz, R. A. Wannamaker, J. Vanderkooy, JAES 40 (1992): mean 0 and variance 1/4 LSB² whatever the value
    assert error.mean() == pytest.approx(0.0, rel=0.0, abs=5 * 0.5 / math.sqrt(200_000))
    assert error.var() == pytest.approx(0.25, rel=0.0, abs=0.005)  # five sigma of a variance of 200,000 samples


def test_codes_end_hard_at_full_scale() -> None:
    codes = quantised(np.array([[2.0, -2.0]]), np.random.default_rng(1))
    assert codes.tolist() == [[1.0 - LSB, -1.0]]


def test_a_converter_bends_by_the_harmonics_it_declares() -> None:
    points = 4096
    wave = bent(np.sin(2.0 * np.pi * np.arange(points) / points)[None, :], (1e-3, 2e-3))
    spectrum = 2.0 * np.abs(np.fft.rfft(wave[0])) / points
    # closed form: sin² = (1 - cos 2θ)/2, sin³ = (3 sin θ - sin 3θ)/4
    assert spectrum[2] == pytest.approx(1e-3, rel=1e-9, abs=0.0)
    assert spectrum[3] == pytest.approx(2e-3, rel=1e-9, abs=0.0)


def test_noise_is_stated_in_20_khz() -> None:
    assert noise_sigma(1.0, 40_000.0) == pytest.approx(1.0, rel=1e-12, abs=0.0)
    assert noise_sigma(1.0, 160_000.0) == pytest.approx(2.0, rel=1e-12, abs=0.0)


def test_a_turned_knob_moves_without_a_jump_and_arrives() -> None:
    knob = Knob(-20.0, 48_000.0, 512)
    assert knob.gains() == pytest.approx(0.1, rel=1e-12, abs=0.0)
    knob.turn(-6.0)
    path = np.concatenate([np.atleast_1d(knob.gains()) for _ in range(2)])
    assert np.abs(np.diff(np.concatenate([[0.1], path]))).max() < 0.005  # 0.4 in 100 and more small steps
    assert path[-1] == pytest.approx(10 ** (-6 / 20), rel=1e-3, abs=0.0)  # 21 ms of two stages of 2 ms
    for _ in range(5):
        knob.gains()
    assert isinstance(knob.gains(), float)


def test_a_gliding_knob_turns_steadily() -> None:
    knob = Knob(-20.0, 48_000.0, 512)
    knob.turn(-10.0, per_second=20.0)
    path_db = 20.0 * np.log10(np.concatenate([np.atleast_1d(knob.gains()) for _ in range(40)]))
    slope = np.diff(path_db[5_000:15_000]) * 48_000.0
    np.testing.assert_allclose(slope, 20.0, rtol=0.0, atol=1e-6)  # rounding of a difference of 4e-4 dB
    for _ in range(20):
        knob.gains()
    assert knob.gains() == pytest.approx(10 ** (-10 / 20), rel=1e-9, abs=0.0)


@given(st.lists(st.integers(1, 50), min_size=1, max_size=20))
def test_history_keeps_the_last_frames_in_place(sizes: list[int]) -> None:
    history = History(64, 1)
    for size in sizes:
        history.append(np.arange(history.end, history.end + size, dtype=np.float64)[:, None])
    first = history.oldest
    kept = history.read(first, history.end - first)[:, 0]
    assert kept.tolist() == list(range(first, sum(sizes)))
    assert history.end - first == min(64, sum(sizes))


def delivered(dropouts: tuple[DropOut, ...], frames: int, chunk: int = 16) -> tuple[list[float], Delivery]:
    history = History(4096, 1)
    delivery = Delivery(dropouts, history)
    for start in range(1, frames + 1, chunk):
        delivery.push(np.arange(start, start + chunk, dtype=np.float64)[:, None])
    return history.read(0, history.end)[:, 0].tolist(), delivery


def test_lost_frames_make_what_follows_earlier() -> None:
    frames, delivery = delivered((DropOut(20, 30),), 96)
    assert frames[:22] == [*range(1, 21), 51, 52]
    assert delivery.delivered(50) == 20
    assert delivery.delivered(49) == 20
    assert delivery.delivered(19) == 19


def test_repeated_frames_make_what_follows_later() -> None:
    frames, delivery = delivered((DropOut(20, 5, Fault.REPEATED),), 96)
    assert frames[15:30] == [16, 17, 18, 19, 20, 16, 17, 18, 19, 20, 21, 22, 23, 24, 25]
    assert delivery.delivered(20) == 25


def test_replaced_frames_leave_what_follows_in_place() -> None:
    frames, delivery = delivered((DropOut(20, 5, Fault.REPLACED),), 96)
    assert frames[18:27] == [19, 20, 0, 0, 0, 0, 0, 26, 27]
    assert delivery.delivered(25) == 25


@settings(max_examples=50)
@given(
    st.lists(st.tuples(st.integers(60, 400), st.integers(1, 40), st.sampled_from(list(Fault))), max_size=4),
    st.sampled_from([1, 7, 64]),
)
def test_a_converted_frame_is_found_where_it_arrives(given_dropouts: list[tuple[int, int, Fault]], chunk: int) -> None:
    dropouts = tuple(DropOut(*each) for each in given_dropouts)
    frames, delivery = delivered(dropouts, 700, chunk)
    values = np.asarray(frames)
    for converted in range(0, 600, 13):
        at = delivery.delivered(converted)
        if converted + 1 in frames:
            arrived = np.flatnonzero(values == converted + 1)
            assert at == arrived[-1] or at in arrived


def test_a_flagged_drop_out_is_a_gap_to_the_blocks_that_touch_it() -> None:
    _, delivery = delivered((DropOut(20, 30), DropOut(60, 4, Fault.REPEATED, flagged=False)), 96)
    assert [gap.first_frame for gap in delivery.gaps(0, 20)] == [19]
    assert [gap.first_frame for gap in delivery.gaps(20, 10)] == [19]
    assert delivery.gaps(21, 1000) == ()
