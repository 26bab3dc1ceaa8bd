"""Signal-to-noise ratio of N-bit words, with and without dither, and levels by the AES17 convention."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import db, read_ok, sine, value
from wattproof.core.reading import Reference
from wattproof.core.signal import Samples

RATE_HZ = 48_000.0
FRAMES = 144_000
# A noise power over BT degrees scatters by 1/√(BT): 4.34·√(1.15/(20 000·3)) = 0.019 dB in 3 s, taper included.
WITHIN_DB = 0.1  # the accuracy that is asked for; five times the scatter above


def _quantised(samples: Samples, bits: int, dither: str, seed: int) -> Samples:
    """Round to `bits`-bit words; TPDF dither is the sum of two even distributions of 1 LSB each, so 2 LSB wide."""
    step = 2.0 ** (1 - bits)
    rng = np.random.default_rng(seed)
    added = rng.uniform(-0.5, 0.5, samples.size) + rng.uniform(-0.5, 0.5, samples.size) if dither == "tpdf" else 0.0
    return np.asarray(np.rint(samples / step + added) * step)


@pytest.mark.parametrize(
    ("bits", "dither", "snr_db"),
    # closed form: 20 lg 2·N + 10 lg 1.5 for even rounding noise of LSB²/12; TPDF dither triples it (−4.7712 dB)
    [(16, "none", 98.0905), (16, "tpdf", 93.3193), (24, "none", 146.2553), (24, "tpdf", 141.4841)],
)
def test_a_quantised_sine_reads_its_theoretical_snr(bits: int, dither: str, snr_db: float) -> None:
    room = 1.0 - 2.0 ** (3 - bits)  # so that dither never reaches the end of the scale
    peak = room * 10.0 ** (-0.05)  # −1 dBFS, at which an odd frequency spreads the rounding evenly
    samples = _quantised(sine(FRAMES, RATE_HZ, 997.0, peak=peak), bits, dither, seed=bits)
    reading = read_ok(samples, RATE_HZ, low_hz=20.0, high_hz=20_000.0)
    in_band_db = snr_db + 10.0 * math.log10((RATE_HZ / 2.0) / (20_000.0 - 20.0))  # white up to half the rate
    expected_db = in_band_db + db(peak)  # the closed form is for a full-scale sine
    assert -db(value(reading.noise)) == pytest.approx(expected_db, rel=0, abs=WITHIN_DB)
    assert -db(value(reading.thdn)) == pytest.approx(expected_db, rel=0, abs=WITHIN_DB)


@pytest.mark.parametrize("high_hz", [20_000.0, 22_000.0, 24_000.0])
def test_white_noise_grows_with_the_band(high_hz: float) -> None:
    noise = np.random.default_rng(4).normal(0.0, 1e-3, FRAMES)
    samples = sine(FRAMES, RATE_HZ, 997.0, peak=0.5) + noise
    reading = read_ok(samples, RATE_HZ, high_hz=high_hz, reference=Reference.FUNDAMENTAL)
    # closed form: white noise has the same power per Hz; 20→22 kHz +0.414 dB, 20→24 kHz +0.792 dB
    share = (high_hz - 20.0) / (RATE_HZ / 2.0)
    assert db(value(reading.noise)) == pytest.approx(db(1e-3 * math.sqrt(2.0 * share) / 0.5), rel=0, abs=WITHIN_DB)


@pytest.mark.parametrize(("peak", "dbfs"), [(1.0, 0.0), (0.5, -6.0206), (0.1, -20.0)])
def test_a_full_scale_sine_reads_0_dbfs(peak: float, dbfs: float) -> None:
    reading = read_ok(sine(48_000, RATE_HZ, 997.0, peak=peak), RATE_HZ)
    # AES17-2020, 3.12: the rms of a full-scale sine is 0 dBFS, so a sine of peak 0.5 reads −6.02 (and not −9.03) dBFS
    assert db(value(reading.level_fs)) == pytest.approx(dbfs, rel=0, abs=5e-5)
    assert db(value(reading.fundamental_fs)) == pytest.approx(dbfs, rel=0, abs=5e-5)
    assert reading.peak_fs == pytest.approx(peak, rel=1e-3, abs=0)


def test_volts_and_watts_follow_from_a_stated_full_scale() -> None:
    # P = V²/R: 20 V rms into 8 Ω is 50 W, closed form
    reading = read_ok(sine(48_000, RATE_HZ, 997.0, peak=0.5), RATE_HZ, full_scale_vrms=40.0, load_ohm=8.0)
    assert value(reading.level_vrms) == pytest.approx(20.0, rel=1e-9, abs=0)
    assert value(reading.power_w) == pytest.approx(50.0, rel=1e-9, abs=0)
