"""The simulated amplifiers deliver what their truth says: gain, onset, and THD+N below, at and beyond it.

The readings here are made by a plain Fourier transform of a whole number of cycles, so that nothing of the measurement
under test is used.
"""

import threading
from functools import lru_cache

import attrs
import numpy as np
import pytest

from wattproof.bench.simulated import CHARACTERS, OPEN_OHM, Interface, SimulatedBench
from wattproof.bench.simulated.characters import character_named
from wattproof.bench.simulated.truth import Truth
from wattproof.core.signal import Samples, Tone

RATE_HZ = 96_000
DRIVE_FS = 10 ** (-12 / 20)  # of 2 V rms
STOP = threading.Event()


@attrs.frozen(eq=False)
class Seen:
    """One second at the terminals: rms of each 1 Hz line, V, shape (lines,)."""

    lines_vrms: Samples
    frequency_hz: int

    def level_vrms(self) -> float:
        return float(np.sqrt((self.lines_vrms[20:20_001] ** 2).sum()))

    def thdn(self) -> float:
        rest = self.lines_vrms.copy()
        rest[self.frequency_hz] = 0.0
        return float(np.sqrt((rest[20:20_001] ** 2).sum())) / self.level_vrms()

    def ratio(self, order: int) -> float:
        return float(self.lines_vrms[order * self.frequency_hz] / self.lines_vrms[self.frequency_hz])


@lru_cache(maxsize=64)
def seen(character: str, knob_db: float, *, frequency_hz: int = 997, load_ohm: float = 8.0, channel: int = 1) -> Seen:
    bench = SimulatedBench(character)
    bench.open()
    bench.turn("knob", knob_db)
    bench.turn("load", load_ohm)
    stands = bench.play(Tone(float(frequency_hz), DRIVE_FS, (1, 2)))
    settle_s = 7 if character_named(character).sag_ohm else 1  # eleven time constants of the supply that sags
    samples = bench.capture(stands + settle_s * RATE_HZ, RATE_HZ, STOP).samples[:, channel - 1]
    full_scale_v = 2.0**0.5 * 2.0 * bench.rig.wirings[0].attenuator.ratio
    lines_vrms = 2.0**0.5 * full_scale_v / RATE_HZ * np.abs(np.fft.rfft(samples))
    return Seen(lines_vrms, frequency_hz)


def knob_db_for(truth: Truth, wanted_vrms: float) -> float:
    return float(20.0 * np.log10(wanted_vrms / (2.0 * DRIVE_FS * truth.gain)))


@pytest.mark.parametrize("character", CHARACTERS)
@pytest.mark.parametrize("share", [0.1, 0.3, 0.95])
def test_below_onset_thdn_is_small_and_as_true(character: str, share: float) -> None:
    truth = Truth(character)
    reading = seen(character, knob_db_for(truth, share * truth.onset_vrms))
    assert reading.thdn() < 0.003
    expected = truth.at(2.0**0.5 * share * truth.onset_vrms)
    assert reading.level_vrms() == pytest.approx(expected[0], rel=1e-4, abs=0.0)  # 0.001 dB
    # the interface adds noise and harmonics of its own: 1e-5 and less; noise of one second varies by 0.5 %
    assert reading.thdn() == pytest.approx(expected[1], rel=0.02, abs=2e-5)


@pytest.mark.parametrize("character", CHARACTERS)
@pytest.mark.parametrize("knob_db", [-3.0, 0.0])
@pytest.mark.parametrize("channel", [1, 2])
def test_beyond_onset_the_clipped_wave_is_as_true(character: str, knob_db: float, channel: int) -> None:
    truth = Truth(character, channel=channel, driven=(1, 2))
    wanted_peak_v = 10 ** (knob_db / 20) * 2.0**1.5 * DRIVE_FS * truth.gain
    level_vrms, thdn = truth.at(wanted_peak_v)
    reading = seen(character, knob_db, channel=channel)
    assert reading.level_vrms() == pytest.approx(level_vrms, rel=2e-5, abs=0.0)  # band-limiting rounds corners a little
    assert reading.thdn() == pytest.approx(thdn, rel=1e-4, abs=0.0)


@pytest.mark.parametrize("character", CHARACTERS)
def test_ten_per_cent_into_8_ohm_lie_within_the_knobs_travel(character: str) -> None:
    truth = Truth(character)
    assert seen(character, 0.0).thdn() > 0.10
    assert truth.onset_vrms < truth.vrms_at_thdn(0.01) < truth.vrms_at_thdn(0.10)
    assert seen(character, -20.0).level_vrms() < 0.95 * truth.onset_vrms


@pytest.mark.parametrize("character", CHARACTERS)
@pytest.mark.parametrize("frequency_hz", [997, 6701])
def test_what_folds_down_stays_below_the_noise(character: str, frequency_hz: int) -> None:
    reading = seen(character, 0.0, frequency_hz=frequency_hz)
    alien = reading.lines_vrms[:20_001].copy()
    alien[:20] = 0.0
    alien[::frequency_hz] = 0.0
    alien[::50] = 0.0
    assert alien.max() / reading.level_vrms() < 10 ** (-100 / 20)


def test_the_crossover_amplifier_distorts_most_at_low_level() -> None:
    truth = Truth("class-ab-crossover")
    low, high = (seen("class-ab-crossover", knob_db_for(truth, share * truth.onset_vrms)) for share in (0.1, 0.9))
    assert low.thdn() > 4.0 * high.thdn()
    assert low.ratio(3) > 10.0 * low.ratio(2)


def test_the_single_ended_amplifier_distorts_by_its_second_harmonic() -> None:
    truth = Truth("class-a-single")
    reading = seen("class-a-single", knob_db_for(truth, 0.8 * truth.onset_vrms))
    assert reading.ratio(2) > 5.0 * max(reading.ratio(order) for order in range(3, 11))


def test_the_class_d_amplifier_leaves_residue_above_the_band() -> None:
    reading = seen("class-d-bridge", -30.0)
    above_vrms = float(np.sqrt((reading.lines_vrms[20_001:] ** 2).sum()))
    assert 2e-3 < above_vrms < 5e-3
    plain = seen("class-a-single", -30.0)
    assert float(np.sqrt((plain.lines_vrms[20_001:] ** 2).sum())) < 0.2e-3


@pytest.mark.parametrize("character", CHARACTERS)
def test_hum_stands_at_multiples_of_the_mains(character: str) -> None:
    reading = seen(character, -40.0)
    hum_vrms = reading.lines_vrms[100]
    assert hum_vrms > 10.0 * np.median(reading.lines_vrms[60:140])


@pytest.mark.parametrize("character", CHARACTERS)
def test_the_load_takes_voltage_and_gives_power(character: str) -> None:
    at_4, at_8, at_open = (seen(character, -25.0, load_ohm=ohm).level_vrms() for ohm in (4.0, 8.0, OPEN_OHM))
    assert at_4 < at_8 < at_open
    gains = [Truth(character, load_ohm=ohm).gain for ohm in (4.0, 8.0, OPEN_OHM)]
    assert at_4 / at_8 == pytest.approx(gains[0] / gains[1], rel=1e-4, abs=0.0)
    assert at_open / at_8 == pytest.approx(gains[2] / gains[1], rel=1e-4, abs=0.0)


def test_a_lower_supply_clips_sooner() -> None:
    assert Truth("class-d-bridge", supply_v=9.0).onset_vrms < 0.8 * Truth("class-d-bridge").onset_vrms
    bench = SimulatedBench("class-d-bridge")
    bench.open()
    bench.turn("knob", 0.0)
    stands = bench.play(Tone(997.0, DRIVE_FS, (1, 2)))
    high_v = np.abs(bench.capture(stands, 9600, STOP).samples[:, 0]).max()
    bench.turn("supply", 9.0)
    low_v = np.abs(bench.capture(stands + 19_200, 9600, STOP).samples[:, 0]).max()
    assert low_v / high_v == pytest.approx((9.0 - 0.3) / (12.0 - 0.3), rel=0.03, abs=0.0)  # band-limiting overshoots


def test_the_truth_of_a_hard_clipped_sine_is_the_closed_form() -> None:
    # A sine of peak V clipped hard at 1 = V·sin(α): fundamental b1 = (2V/π)(α + sin α cos α), mean square
    # (V²/π)(α - sin α cos α) + 1 - 2α/π (elementary integrals over a quarter period); all harmonics counted.
    truth = Truth("class-d-bridge", band_hz=(0.0, 2e7))  # beyond the last harmonic of the grid
    upper_v, _ = truth._limits_v  # noqa: SLF001 - the truth's own limit, to scale the closed form
    over = 1.4
    alpha = float(np.arcsin(1.0 / over))
    b1 = 2.0 * over / np.pi * (alpha + np.sin(alpha) * np.cos(alpha))
    mean_square = over**2 / np.pi * (alpha - np.sin(alpha) * np.cos(alpha)) + 1.0 - 2.0 * alpha / np.pi
    thdn = float(np.sqrt(1.0 - b1**2 / 2.0 / mean_square))
    # the corner is round over 0.4 % of the limit and the third-order curvature takes 0.2 % of the top
    assert truth.at(over * upper_v)[1] == pytest.approx(thdn, rel=0.01, abs=0.0)


def test_a_silent_interface_and_ideal_divider_are_possible() -> None:
    quiet = Interface(output_harmonics=(0.0, 0.0), input_harmonics=(0.0, 0.0), output_noise_fs=0.0, input_noise_fs=0.0)
    bench = SimulatedBench(interface=quiet)
    bench.open()
    stands = bench.play(Tone(997.0, DRIVE_FS))
    assert bench.capture(stands, 100, STOP).frames == 100


def test_a_sagging_supply_gives_more_at_first_than_once_it_has_settled() -> None:
    bench = SimulatedBench("sagging-supply")
    bench.open()
    bench.turn("knob", -3.0)
    stands = bench.play(Tone(997.0, DRIVE_FS, (1,)))
    first = np.std(bench.capture(stands, RATE_HZ // 10, STOP).samples[:, 0])
    settled = np.std(bench.capture(stands + 7 * RATE_HZ, RATE_HZ // 10, STOP).samples[:, 0])
    assert 0.2 < 20.0 * np.log10(first / settled) < 0.6  # up to half a decibel, as unregulated supplies do


def test_a_settled_supply_is_down_by_its_own_resistance_times_the_mean_current() -> None:
    truth = Truth("sagging-supply", load_ohm=8.0)
    onset_peak_v = 2.0**0.5 * truth.onset_vrms
    mean_a = 2.0 / np.pi * onset_peak_v / 8.0  # rectified mean of a sine, closed form
    assert truth.droop_v(onset_peak_v) == pytest.approx(0.60 * mean_a, rel=0.01, abs=0.0)  # the knee takes 0.8 %
    both = attrs.evolve(truth, driven=(1, 2))
    assert both.droop_v(onset_peak_v) == pytest.approx(2.0 * truth.droop_v(onset_peak_v), rel=0.03, abs=0.0)


def test_a_scratchy_control_drops_out_while_it_is_turned_and_not_at_rest() -> None:
    bench = SimulatedBench("scratchy-control")
    bench.open()
    bench.turn("knob", -40.0)
    stands = bench.play(Tone(997.0, DRIVE_FS, (1,)))
    rest = bench.capture(stands + RATE_HZ, RATE_HZ, STOP).samples[:, 0]
    bench.glide("knob", -30.0, 6.0)
    turned = bench.capture(stands + 2 * RATE_HZ, RATE_HZ, STOP).samples[:, 0]
    assert _lowest(rest) > 0.9 * _lowest(rest[:4800])
    assert _lowest(turned) < 0.6 * _lowest(rest)  # although it was turned up


def _lowest(samples: Samples) -> float:
    """Return the smallest peak of any two cycles."""
    pieces = samples[: samples.size // 193 * 193].reshape(-1, 193)
    return float(np.abs(pieces).max(axis=1).min())
