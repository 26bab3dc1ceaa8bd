"""Delay, response, polarity and echo of a path, against first-order filters whose response is a closed form."""

import numpy as np
import pytest
from scipy.signal import lfilter

from wattproof.core.signal import Samples, Sweep
from wattproof.dsp.sweep import ECHO_S, path_of, points
from wattproof.signals.sweep import sweep_samples

RATE_HZ = 48_000.0
SWEEP = Sweep(5.0, 0.5, end_hz=22_500.0, seconds=2.0)
TAIL = 24_000


def played() -> Samples:
    return sweep_samples(SWEEP, RATE_HZ)


def through(delay: int, sign: float = 1.0, noise: float = 0.0) -> Samples:
    wave = np.concatenate([np.zeros(delay), played(), np.zeros(TAIL - delay)])
    rng = np.random.default_rng(1)
    return np.asarray(sign * wave + noise * rng.standard_normal(wave.size), dtype=np.float64)


def test_points_include_both_ends_and_stand_a_twelfth_of_an_octave_apart() -> None:
    frequencies = points(10.0, 20_480.0)
    assert frequencies[0] == pytest.approx(10.0, rel=1e-12, abs=0.0)
    assert frequencies[-1] == pytest.approx(20_480.0, rel=1e-12, abs=0.0)
    np.testing.assert_allclose(frequencies[1:] / frequencies[:-1], 2.0 ** (1.0 / 12.0), rtol=1e-9, atol=0.0)


@pytest.mark.parametrize("delay", [0, 1, 777])
def test_a_pure_delay_has_gain_one_at_every_frequency(delay: int) -> None:
    path = path_of(through(delay), played(), RATE_HZ, 10.0, 21_000.0)
    assert path.delay_frames == pytest.approx(delay, rel=0.0, abs=1e-6)
    np.testing.assert_allclose(path.gain, 1.0, rtol=0.0, atol=1e-6)  # rounding of float64 transforms, 120 dB down
    assert not path.inverted
    assert path.echo < 3e-3  # what the band's end at 22.5 kHz leaves of a sinc after 3 ms: 1/(π·144)


def test_a_coupling_and_a_low_pass_are_read_as_their_closed_forms() -> None:
    # bilinear first-order high-pass at 3 Hz; its exact digital response, not the analogue one, is the truth here
    warped = np.tan(np.pi * 3.0 / RATE_HZ)
    b, a = [1.0 / (1.0 + warped), -1.0 / (1.0 + warped)], [1.0, (warped - 1.0) / (1.0 + warped)]
    path = path_of(lfilter(b, a, through(100)), played(), RATE_HZ, 10.0, 21_000.0)
    z = np.exp(-2j * np.pi * path.frequency_hz / RATE_HZ)
    truth = (b[0] + b[1] * z) / (a[0] + a[1] * z)
    turned = path.gain * np.exp(-2j * np.pi * path.frequency_hz / RATE_HZ * (path.delay_frames - 100))
    np.testing.assert_allclose(turned, truth, rtol=0.0, atol=5e-4)  # 0.004 dB: the bins of the lowest points


def test_the_scatter_covers_what_noise_does() -> None:
    path = path_of(through(50, noise=1e-3), played(), RATE_HZ, 10.0, 21_000.0)
    off = np.abs(path.gain - 1.0)[path.frequency_hz > 100.0]
    told = path.u[path.frequency_hz > 100.0]
    # the mean square of |off| is 2u² where u is honest; some 90 points scatter by a tenth of it
    assert np.mean(off**2) / np.mean(2.0 * told**2) == pytest.approx(1.0, rel=0.5, abs=0.0)


def test_a_turned_sign_and_an_echo_are_seen() -> None:
    assert path_of(through(50, sign=-1.0), played(), RATE_HZ, 10.0, 21_000.0).inverted
    echoed = through(50)
    late = round(4.0 * ECHO_S * RATE_HZ)
    echoed[late:] += 0.2 * through(50)[:-late]
    assert path_of(echoed, played(), RATE_HZ, 10.0, 21_000.0).echo == pytest.approx(0.2, rel=0.05, abs=0.0)


def test_a_capture_that_is_too_short_is_refused() -> None:
    with pytest.raises(ValueError, match="capture all of the sweep"):
        path_of(played()[:-1], played(), RATE_HZ, 10.0, 21_000.0)
