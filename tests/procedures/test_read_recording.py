"""Reading a recording: what it finds by itself, what it says of it, and what it refuses."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.dsp.waveforms import capture, db, read_ok, read_one, sine, value
from wattproof.core.notes import Kind
from wattproof.core.reading import Reading, ReadingSettings, Reference, Remark, State
from wattproof.core.signal import Capture, Overload, Samples
from wattproof.procedures.read_recording import read_recording

RATE_HZ = 48_000.0
HARMONICS = {2: (1e-3, 0.5), 3: (4e-4, -2.0)}
NAMES = ("thdn", "thd", "noise", "hum", "level_fs", "fundamental_fs", "fundamental_hz", "crest_factor")


def _amplifier(seconds: float = 1.0, *, frequency_hz: float = 997.0, seed: int = 1, noise: float = 1e-5) -> Samples:
    frames = round(seconds * RATE_HZ)
    added = np.random.default_rng(seed).normal(0.0, noise, frames)
    return sine(frames, RATE_HZ, frequency_hz, peak=0.5, phase_rad=0.7, harmonics=HARMONICS) + added


def _kinds(reading: Reading) -> list[Kind]:
    return [note.kind for note in reading.notes]


def _values(reading: Reading) -> list[float]:
    return [value(getattr(reading, name)) for name in NAMES]


def test_a_sound_recording_is_read_without_a_note() -> None:
    reading = read_one(_amplifier(), RATE_HZ)
    assert (reading.state, reading.notes) == (State.OK, ())
    assert reading.span.first_frame == 0
    assert reading.span.frames >= 0.98 * RATE_HZ
    assert value(reading.thd) == pytest.approx(math.hypot(1e-3, 4e-4), rel=1e-3, abs=0)
    by_order = {harmonic.order: harmonic for harmonic in reading.harmonics}
    assert sorted(by_order) == list(range(2, 21))  # to the band's end
    assert by_order[2].phase_rad == pytest.approx(0.5, rel=0, abs=0.01)
    assert by_order[3].phase_rad == pytest.approx(-2.0, rel=0, abs=0.01)
    assert by_order[2].remark is None
    assert sum(by_order[order].remark is Remark.NOT_SEEN for order in range(4, 21)) >= 15


@pytest.mark.parametrize(("before_s", "after_s"), [(0.7, 0.0), (0.0, 0.7), (0.4, 0.6), (2.0, 3.0)])
@pytest.mark.parametrize("silence", [0.0, 1e-5])
def test_a_tone_that_starts_late_or_ends_early_is_read_as_if_alone(
    before_s: float, after_s: float, silence: float
) -> None:
    tone = _amplifier(1.0)
    rng = np.random.default_rng(5)
    lead, tail = (rng.normal(0.0, 1.0, round(s * RATE_HZ)) * silence for s in (before_s, after_s))
    reading = read_one(np.concatenate([lead, tone, tail]), RATE_HZ)
    assert reading.state is State.OK
    expected = [Kind.STARTS_LATE] * bool(before_s) + [Kind.ENDS_EARLY] * bool(after_s)
    assert _kinds(reading) == expected
    assert reading.span.start_s >= before_s
    assert reading.span.start_s + reading.span.seconds <= before_s + 1.0 + 1e-9
    assert reading.span.seconds > 0.9
    alone = read_one(tone, RATE_HZ)
    # the steady part is up to a tenth shorter, so the noise scatters by 0.35 % of itself and is 2 % of THD+N
    np.testing.assert_allclose(_values(reading)[:2], _values(alone)[:2], rtol=2e-3, atol=0)
    np.testing.assert_allclose(_values(reading)[4:7], _values(alone)[4:7], rtol=1e-6, atol=0)


def test_ramped_ends_are_left_out_too() -> None:
    tone = _amplifier(1.0)
    ramp = np.minimum(1.0, np.arange(tone.size) / 4800.0)  # 0.1 s, as a careful source starts and stops
    reading = read_one(np.concatenate([np.zeros(9600), tone * ramp * ramp[::-1], np.zeros(9600)]), RATE_HZ)
    assert reading.state is State.OK
    assert value(reading.thdn) == pytest.approx(value(read_one(tone, RATE_HZ).thdn), rel=3e-3, abs=0)
    assert value(reading.level_fs) == pytest.approx(0.5, rel=1e-5, abs=0)


def test_a_short_tone_in_a_long_silence_is_found() -> None:
    rng = np.random.default_rng(4)
    samples = rng.normal(0.0, 1e-3, 10 * 48_000)
    samples[200_000:214_400] += sine(14_400, RATE_HZ, 997.0, peak=0.02)
    reading = read_one(samples, RATE_HZ)
    assert reading.state is State.OK
    assert value(reading.fundamental_fs) == pytest.approx(0.02, rel=0.01, abs=0)
    assert reading.span.seconds < 0.31


@pytest.mark.parametrize("step_db", [-6.0, 3.0])
def test_a_level_step_is_not_averaged(step_db: float) -> None:
    samples = _amplifier(2.0)
    samples[60_000:] *= 10.0 ** (step_db / 20.0)
    reading = read_one(samples, RATE_HZ)
    assert reading.state is State.OK
    assert _kinds(reading) == [Kind.LEVEL_STEP]
    assert reading.span.end_frame <= 60_000  # the longer part
    assert value(reading.level_fs) == pytest.approx(0.5, rel=1e-5, abs=0)


@pytest.mark.parametrize("lost", [1, 32, 500])
def test_lost_frames_are_not_read_across(lost: int) -> None:
    samples = np.delete(_amplifier(2.0), np.arange(60_000, 60_000 + lost))
    reading = read_one(samples, RATE_HZ)
    assert reading.state is State.OK
    assert _kinds(reading) == [Kind.BREAK]
    assert reading.span.end_frame <= 60_000
    assert value(reading.thd) == pytest.approx(math.hypot(1e-3, 4e-4), rel=1e-3, abs=0)


def test_a_second_tone_counts_in_noise_and_is_named() -> None:
    samples = _amplifier() + 0.05 * sine(48_000, RATE_HZ, 1523.4)
    reading = read_one(samples, RATE_HZ, reference=Reference.FUNDAMENTAL)
    assert _kinds(reading) == [Kind.SECOND_TONE]
    assert value(reading.noise) == pytest.approx(0.1, rel=1e-3, abs=0)
    assert value(reading.thd) == pytest.approx(math.hypot(1e-3, 4e-4), rel=1e-2, abs=0)


def test_a_carrier_above_20_khz_is_said_where_the_rate_shows_it() -> None:
    tone = sine(96_000, 96_000.0, 997.0, peak=0.5)
    assert _kinds(read_one(tone + 0.02 * sine(96_000, 96_000.0, 31_000.0), 96_000.0)) == [Kind.CARRIER]
    assert _kinds(read_one(tone + 0.002 * sine(96_000, 96_000.0, 31_000.0), 96_000.0)) == []


def test_a_given_fundamental_is_read_even_where_another_line_is_stronger() -> None:
    samples = sine(48_000, RATE_HZ, 997.0, peak=0.1) + sine(48_000, RATE_HZ, 2500.0, peak=0.5)
    reading = read_ok(samples, RATE_HZ, fundamental_hz=1000.0 - 3.0)
    assert value(reading.fundamental_hz) == pytest.approx(997.0, rel=1e-6, abs=0)
    assert value(reading.fundamental_fs) == pytest.approx(0.1, rel=1e-3, abs=0)
    assert Kind.STRONGER_LINE in _kinds(reading)
    said = dict(reading.notes[_kinds(reading).index(Kind.STRONGER_LINE)].values)
    assert said["frequency_hz"] == pytest.approx(2500.0, rel=1e-3, abs=0)
    assert said["db"] == pytest.approx(db(5.0), rel=0, abs=0.1)
    by_itself = read_ok(samples, RATE_HZ)
    assert value(by_itself.fundamental_hz) == pytest.approx(2500.0, rel=1e-6, abs=0)


@pytest.mark.parametrize("wanted_hz", [1500.0, 5000.0, 60.0])
def test_a_given_fundamental_that_is_not_there_is_no_tone(wanted_hz: float) -> None:
    reading = read_one(_amplifier(), RATE_HZ, fundamental_hz=wanted_hz)
    assert reading.state is State.NO_TONE
    assert reading.thdn is None


def test_without_a_tone_level_noise_hum_and_lines_are_still_read() -> None:
    hum = 1e-3 * sine(96_000, RATE_HZ, 50.0) + 5e-4 * sine(96_000, RATE_HZ, 150.0)
    noise = np.random.default_rng(2).normal(0.0, 5e-4, 96_000)
    reading = read_one(hum + noise, RATE_HZ)
    assert reading.state is State.NO_TONE
    assert _kinds(reading) == [Kind.ONLY_MAINS]
    for name in ("thdn", "thd", "fundamental_hz", "fundamental_fs", "sinad"):
        assert getattr(reading, name) is None
    assert reading.harmonics == ()
    in_band = 5e-4 * math.sqrt(19_980.0 / 24_000.0)  # rms
    hum_rms = math.hypot(1e-3, 5e-4) / math.sqrt(2.0)
    total = math.hypot(in_band, hum_rms)
    assert value(reading.level_fs) == pytest.approx(total * math.sqrt(2.0), rel=0.01, abs=0)
    assert value(reading.hum) == pytest.approx(hum_rms / total, rel=0.01, abs=0)
    assert value(reading.noise) == pytest.approx(in_band / total, rel=0.01, abs=0)
    assert [round(line.frequency_hz) for line in reading.mains.lines] == [50, 150]


def test_noise_alone_is_no_tone() -> None:
    for seed in range(20):
        reading = read_one(np.random.default_rng(seed).normal(0.0, 0.1, 24_000), RATE_HZ)
        assert reading.state is State.NO_TONE
        assert _kinds(reading) == [Kind.NO_TONE]


def test_digital_silence_is_no_tone() -> None:
    reading = read_one(np.zeros(48_000), RATE_HZ)
    assert reading.state is State.NO_TONE
    assert value(reading.level_fs) == 0.0


@pytest.mark.parametrize("frames", [1, 15, 255])
def test_a_few_frames_are_too_short(frames: int) -> None:
    assert read_one(_amplifier()[:frames], RATE_HZ).state is State.TOO_SHORT


@pytest.mark.parametrize(("cycles", "state"), [(2.0, State.TOO_SHORT), (2.9, State.TOO_SHORT), (3.2, State.OK)])
def test_three_cycles_are_the_least(cycles: float, state: State) -> None:
    frames = round(cycles * RATE_HZ / 25.0)
    samples = sine(frames, RATE_HZ, 25.0, peak=0.5, harmonics={2: (1e-2, 0.0)})
    reading = read_one(samples, RATE_HZ, fundamental_hz=25.0)
    assert reading.state is state
    if state is State.OK:
        assert value(reading.thd) == pytest.approx(1e-2, rel=1e-3, abs=0)
    else:
        assert _kinds(reading) == [Kind.TOO_FEW_CYCLES]
        assert reading.thdn is None


def test_each_channel_is_read_by_itself() -> None:
    left, right = _amplifier(frequency_hz=997.0), _amplifier(frequency_hz=3001.0, seed=2)
    silent = np.random.default_rng(3).normal(0.0, 1e-5, left.size)
    readings = read_recording(capture(left, right, silent, rate_hz=RATE_HZ), ReadingSettings())
    assert [reading.channel for reading in readings] == [1, 2, 3]
    assert [reading.state for reading in readings] == [State.OK, State.OK, State.NO_TONE]
    assert value(readings[0].fundamental_hz) == pytest.approx(997.0, rel=1e-6, abs=0)
    assert value(readings[1].fundamental_hz) == pytest.approx(3001.0, rel=1e-6, abs=0)
    (only,) = read_recording(capture(left, right, silent, rate_hz=RATE_HZ), ReadingSettings(), channels=(2,))
    assert only == readings[1]


def test_a_channel_that_is_not_there_is_refused() -> None:
    with pytest.raises(ValueError, match="no channel 3; the recording has 1"):
        read_recording(Capture(_amplifier()[:, None], RATE_HZ), ReadingSettings(), channels=(3,))


def test_an_overloaded_recording_is_withheld() -> None:
    clipped = np.clip(2.5 * _amplifier(), -1.0, 1.0)
    runs = tuple(Overload(1, first, 6) for first in range(5, 48_000, 24))
    (reading,) = read_recording(Capture(clipped[:, None], RATE_HZ, overloads=runs), ReadingSettings())
    assert reading.state is State.OVERLOAD
    assert _kinds(reading) == [Kind.OVERLOADED]
    assert (reading.thdn, reading.level_fs, reading.fundamental_hz) == (None, None, None)
    assert reading.peak_fs == 1.0


def test_a_level_that_moves_by_decibels_is_unsteady_and_one_that_creeps_is_said() -> None:
    fading = _amplifier(2.0) * 10.0 ** (np.linspace(0.0, -3.0, 96_000) / 20.0)
    reading = read_one(fading, RATE_HZ)
    assert reading.state is State.UNSTEADY
    assert reading.thdn is None
    assert Kind.LEVEL_MOVES in _kinds(reading)
    creeping = _amplifier(2.0) * 10.0 ** (np.linspace(0.0, -0.3, 96_000) / 20.0)
    reading = read_one(creeping, RATE_HZ)
    assert reading.state is State.OK
    assert _kinds(reading) == [Kind.LEVEL_MOVES]
    assert db(value(reading.thdn) / math.hypot(1e-3, 4e-4, 2.6e-5)) == pytest.approx(0.0, rel=0, abs=0.1)


@settings(max_examples=30)
@given(
    h2_db=st.floats(-120.0, -10.0),
    hum_db=st.floats(-120.0, -20.0),
    noise_db=st.floats(-120.0, -30.0),
    reference=st.sampled_from(list(Reference)),
    frequency_hz=st.floats(200.0, 6000.0),
)
def test_thdn_is_the_sum_of_its_parts(
    h2_db: float, hum_db: float, noise_db: float, reference: Reference, frequency_hz: float
) -> None:
    frames = 14_400
    noise = np.random.default_rng(1).normal(0.0, 0.35 * 10.0 ** (noise_db / 20.0), frames)
    hum = 0.5 * 10.0 ** (hum_db / 20.0) * sine(frames, RATE_HZ, 50.0)
    tone = sine(frames, RATE_HZ, frequency_hz, peak=0.5, harmonics={2: (10.0 ** (h2_db / 20.0), 1.0)})
    reading = read_ok(tone + hum + noise, RATE_HZ, reference=reference)
    parts = math.hypot(value(reading.thd), value(reading.hum), value(reading.noise))
    assert value(reading.thdn) == pytest.approx(parts, rel=1e-9, abs=0)


def test_polarity_changes_nothing_but_the_phases_of_odd_and_even() -> None:
    samples = _amplifier()
    one, other = read_ok(samples, RATE_HZ), read_ok(-samples, RATE_HZ)
    np.testing.assert_allclose(_values(other), _values(one), rtol=1e-9, atol=0)
    second, turned = one.harmonics[0].phase_rad, other.harmonics[0].phase_rad
    # −f(θ) with θ' = θ + π: an even harmonic changes its sign against the fundamental, an odd one does not
    assert abs(math.remainder(turned - second, 2.0 * math.pi)) == pytest.approx(math.pi, rel=0, abs=1e-6)
    assert other.harmonics[1].phase_rad == pytest.approx(one.harmonics[1].phase_rad, rel=0, abs=1e-6)


@pytest.mark.parametrize("gain", [1e-4, 0.01, 1.9])
def test_gain_scales_levels_and_nothing_else(gain: float) -> None:
    samples = _amplifier()
    one, other = read_ok(samples, RATE_HZ), read_ok(gain * samples, RATE_HZ)
    scale = np.array([gain if name.endswith("_fs") else 1.0 for name in NAMES])
    np.testing.assert_allclose(_values(other), scale * np.array(_values(one)), rtol=1e-6, atol=0)


def test_the_order_of_channels_does_not_matter() -> None:
    left, right = _amplifier(), _amplifier(frequency_hz=1499.0, seed=2)
    forward = read_recording(capture(left, right, rate_hz=RATE_HZ), ReadingSettings())
    backward = read_recording(capture(right, left, rate_hz=RATE_HZ), ReadingSettings())
    assert _values(forward[0]) == _values(backward[1])
    assert _values(forward[1]) == _values(backward[0])


@pytest.mark.parametrize("rate_hz", [44_100.0, 88_200.0, 96_000.0, 176_400.0, 192_000.0])
def test_the_sampling_rate_does_not_matter(rate_hz: float) -> None:
    def reading_at(rate: float) -> Reading:
        frames = round(rate)
        return read_ok(sine(frames, rate, 997.0, peak=0.5, phase_rad=0.7, harmonics=HARMONICS), rate)

    one, other = reading_at(RATE_HZ), reading_at(rate_hz)
    for name in ("thdn", "thd", "level_fs", "fundamental_fs", "fundamental_hz"):
        assert value(getattr(other, name)) == pytest.approx(value(getattr(one, name)), rel=1e-6, abs=0)


@pytest.mark.parametrize("shift", [1, 777, 24_000])
def test_a_shift_in_time_does_not_matter(shift: int) -> None:
    whole = sine(96_000, RATE_HZ, 997.0, peak=0.5, harmonics=HARMONICS)
    one, other = read_ok(whole[:48_000], RATE_HZ), read_ok(whole[shift : shift + 48_000], RATE_HZ)
    for name in ("thdn", "thd", "level_fs", "fundamental_fs", "fundamental_hz"):
        assert value(getattr(other, name)) == pytest.approx(value(getattr(one, name)), rel=1e-7, abs=0)
    for first, second in zip(one.harmonics[:2], other.harmonics[:2], strict=True):
        assert second.phase_rad == pytest.approx(first.phase_rad, rel=0, abs=1e-6)
