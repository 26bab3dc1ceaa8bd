"""THD to the fundamental and to the total, SINAD, and the sum of noise and harmonics, by their definitions."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import db, read_ok, sine, value
from wattproof.core.reading import Reference

RATE_HZ = 96_000.0


@pytest.mark.parametrize(
    ("percent_f", "percent_r"),
    # definition: THD_R = THD_F/√(1 + THD_F²)
    [(0.001, 0.001), (0.1, 0.099_999_95), (1.0, 0.999_95), (3.0, 2.998_651), (10.0, 9.950_372), (30.0, 28.734_79)],
)
def test_both_references_read_what_their_definitions_say(percent_f: float, percent_r: float) -> None:
    samples = sine(48_000, RATE_HZ, 997.0, peak=0.5, harmonics={2: (percent_f / 100.0, 0.3)})
    to_fundamental = read_ok(samples, RATE_HZ, reference=Reference.FUNDAMENTAL)
    to_total = read_ok(samples, RATE_HZ, reference=Reference.TOTAL)
    assert 100.0 * value(to_fundamental.thd) == pytest.approx(percent_f, rel=1e-9, abs=0)
    assert 100.0 * value(to_total.thd) == pytest.approx(percent_r, rel=5e-7, abs=0)  # digits of the table


@pytest.mark.parametrize("reference", list(Reference))
@pytest.mark.parametrize("level_db", [-0.5, -20.0, -60.0, -98.09])
def test_sinad_is_the_total_over_all_but_the_fundamental(reference: Reference, level_db: float) -> None:
    ratio = 10.0 ** (level_db / 20.0)
    samples = sine(48_000, RATE_HZ, 997.0, peak=0.5, harmonics={3: (ratio, -1.0)})
    sinad = read_ok(samples, RATE_HZ, reference=reference).sinad
    # definition: (S + N + D)/(N + D), so minus the THD+N to the total in dB, whatever the reference of the ratios
    assert db(value(sinad)) == pytest.approx(10 * math.log10((1 + ratio**2) / ratio**2), rel=0, abs=1e-6)


@pytest.mark.parametrize(("below_db", "percent"), [(80, 0.010_440), (90, 0.004_358_9), (100, 0.003_162_3)])
def test_noise_and_harmonics_add_by_their_squares(below_db: int, percent: float) -> None:
    # definition: √(THD² + (N/U1)²), THD 0.003 % and noise 80, 90, 100 dB below the fundamental in 20 Hz–20 kHz
    frames, share = 480_000, (20_000.0 - 20.0) / (RATE_HZ / 2.0)
    spread = 0.5 / math.sqrt(2.0) * 10.0 ** (-below_db / 20.0) / math.sqrt(share)
    noise = np.random.default_rng(below_db).normal(0.0, spread, frames)
    samples = sine(frames, RATE_HZ, 997.0, peak=0.5, harmonics={2: (3e-5, 0.0)}) + noise
    reading = read_ok(samples, RATE_HZ, reference=Reference.FUNDAMENTAL)
    # 5 s of 20 kHz: the noise power scatters by √(1.15/100 000) = 0.34 %, its root by half of that; four times that
    assert 100.0 * value(reading.thdn) == pytest.approx(percent, rel=4 * 0.0017, abs=0)
