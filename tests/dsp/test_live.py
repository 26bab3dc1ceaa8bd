"""The live reading: a moving level, steps, lost frames, overload, silence, and what is followed from block to block."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import capture, db, sine, value
from wattproof.core.notes import Kind
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture, Gap, Overload, Samples
from wattproof.dsp.live import LEAST_CYCLES, SHORTEST_S, STILL_S, LiveReader

RATE_HZ = 96_000.0


def _moved_by_hand(seconds: float, rate_db_per_s: float, *, wobble: float) -> Samples:
    """Return the level of a knob turned at a rate that wobbles by ±wobble at 3 Hz, ending at 0 dB."""
    t = np.arange(round(seconds * RATE_HZ)) / RATE_HZ
    moved_db = rate_db_per_s * (t + wobble * (1.0 - np.cos(2.0 * np.pi * 3.0 * t)) / (2.0 * np.pi * 3.0))
    return np.asarray(10.0 ** ((moved_db - moved_db.max()) / 20.0))


def _follow(samples: Samples, hop_s: float = 0.05) -> list[Reading]:
    """Read a signal as a watch would: each block as long as the reader proposes, ends hop_s apart."""
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    readings, end = [], round(STILL_S * 1.02 * RATE_HZ)
    while end <= samples.size:
        first = max(0, end - reader.next_frames)
        (reading,), _ = reader.take(capture(samples[first:end], rate_hz=RATE_HZ, first_frame=first))
        readings.append(reading)
        end += round(hop_s * RATE_HZ)
    return readings


@pytest.mark.parametrize(("rate_db_per_s", "limit_db"), [(6.0, -80.0), (-6.0, -80.0), (20.0, -60.0), (-20.0, -60.0)])
@pytest.mark.parametrize("wobble", [0.0, 0.6])
def test_a_level_moved_by_hand_does_not_show_as_distortion(
    rate_db_per_s: float, limit_db: float, wobble: float
) -> None:
    level = _moved_by_hand(1.6, rate_db_per_s, wobble=wobble)
    readings = _follow(sine(level.size, RATE_HZ, 997.0, peak=0.9 * level))
    read = [reading for reading in readings if reading.state is State.OK]
    assert len(read) >= len(readings) - 1  # a first block of a quarter second may be refused
    assert max(db(value(reading.thdn)) for reading in read) < limit_db
    for reading in read:
        assert Kind.LEVEL_MOVES in {note.kind for note in reading.notes}
        assert abs(reading.moving_db_per_s) * reading.span.seconds <= 0.5  # rate·T
        assert SHORTEST_S * 0.98 <= reading.span.seconds <= STILL_S * 1.02


def test_the_rate_of_a_moving_level_is_told() -> None:
    level = _moved_by_hand(1.0, 10.0, wobble=0.0)
    last = _follow(sine(level.size, RATE_HZ, 997.0, peak=0.9 * level))[-1]
    assert last.moving_db_per_s == pytest.approx(10.0, rel=0.01, abs=0)
    told = dict(next(note for note in last.notes if note.kind is Kind.LEVEL_MOVES).values)
    assert told["db_per_s"] == pytest.approx(10.0, rel=0.05, abs=0)


def test_true_distortion_is_read_through_a_moving_level() -> None:
    level = _moved_by_hand(1.0, 6.0, wobble=0.0)
    harmonics = {2: (10.0**-3.5, 0.0), 3: (1e-4, 0.0)}
    samples = sine(level.size, RATE_HZ, 997.0, peak=0.9 * level, harmonics=harmonics)
    expected = math.hypot(10.0**-3.5, 1e-4)
    for reading in _follow(samples)[1:]:
        assert db(value(reading.thdn) / expected) == pytest.approx(0.0, rel=0, abs=0.1)


def test_a_still_level_reads_long_blocks_without_a_note() -> None:
    noise = np.random.default_rng(2).normal(0.0, 1e-4, 144_000)
    for reading in _follow(sine(144_000, RATE_HZ, 997.0, peak=0.5) + noise):
        assert (reading.state, reading.notes) == (State.OK, ())
        assert reading.span.seconds == pytest.approx(STILL_S, rel=0.02, abs=0)


def test_noise_alone_does_not_shorten_the_blocks() -> None:
    rng = np.random.default_rng(3)
    for snr_db in (20.0, 40.0, 60.0):
        spread = 0.5 / math.sqrt(2.0) * 10.0 ** (-snr_db / 20.0)
        samples = sine(288_000, RATE_HZ, 997.0, peak=0.5) + rng.normal(0.0, spread, 288_000)
        readings = _follow(samples)
        # strong white noise has content above 20 kHz too, and its note is right
        still = [
            reading.state is State.OK and Kind.LEVEL_MOVES not in {note.kind for note in reading.notes}
            for reading in readings
        ]
        assert sum(still) >= 0.98 * len(still)


@pytest.mark.parametrize("step_db", [-6.0, -1.5, -0.3, 0.3, 1.5, 6.0])
def test_a_level_step_is_told_once_with_its_place_and_read_around(step_db: float) -> None:
    level = np.full(96_000, 0.3)
    level[60_000:] *= 10.0 ** (step_db / 20.0)
    readings = _follow(sine(96_000, RATE_HZ, 997.0, peak=level))
    refused = [reading for reading in readings if reading.state is not State.OK]
    assert len(refused) == 1
    said = dict(refused[0].notes[0].values)
    assert refused[0].state is State.UNSTEADY
    assert refused[0].thdn is None
    assert refused[0].notes[0].kind is Kind.LEVEL_STEP
    assert said["at_s"] == pytest.approx(60_000 / RATE_HZ, rel=0, abs=0.01)
    assert said["db"] == pytest.approx(step_db, rel=0.01, abs=0)
    for reading in readings:
        assert reading.state is not State.OK or not reading.span.first_frame < 60_000 < reading.span.end_frame


@pytest.mark.parametrize("step_db", [0.01, 0.03, 0.1, 0.3, 1.0])
@pytest.mark.parametrize("smooth_s", [0.0, 0.005])
def test_a_step_of_any_size_never_shows_as_distortion(step_db: float, smooth_s: float) -> None:
    n = np.arange(96_000)
    risen = np.clip((n - 60_000) / max(1.0, smooth_s * RATE_HZ), 0.0, 1.0)
    readings = _follow(sine(96_000, RATE_HZ, 997.0, peak=0.3 * 10.0 ** (step_db * risen / 20.0)))
    read = [reading for reading in readings if reading.state is State.OK]
    assert len(read) >= len(readings) - 1
    # stricter than the −60 dB that the fastest hand may leave
    assert max(reading.thdn.value for reading in read if reading.thdn) < 10.0 ** (-65.0 / 20.0)


@pytest.mark.parametrize("lost", [1, 7, 48, 64, 256, 480, 1024])
@pytest.mark.parametrize("snr_db", [40.0, 80.0])
def test_lost_frames_are_refused(lost: int, snr_db: float) -> None:
    n = np.arange(24_500)
    n[11_000:] += lost
    noise = np.random.default_rng(lost).normal(0.0, 0.5 / math.sqrt(2.0) * 10.0 ** (-snr_db / 20.0), n.size)
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    reader.take(capture(sine(24_500, RATE_HZ, 997.0, peak=0.5), rate_hz=RATE_HZ))
    broken = 0.5 * np.sin(2.0 * np.pi * (997.0 * n / RATE_HZ % 1.0)) + noise
    (reading,), _ = reader.take(capture(broken, rate_hz=RATE_HZ))
    turn = abs((997.0 * lost / RATE_HZ + 0.5) % 1.0 - 0.5) * 2.0 * np.pi
    if reading.state is State.OK:
        # what is not refused must not be seen: a step this small in noise this strong
        assert turn < 0.019, "the phase steps by this many rad"
    else:
        assert reading.state is State.UNSTEADY
        assert reading.thdn is None


def test_a_block_with_a_gap_is_refused_even_where_the_samples_look_sound() -> None:
    block = Capture(sine(24_500, RATE_HZ, 997.0, peak=0.5)[:, None], RATE_HZ, 1000, gaps=(Gap(9000, 48, "driver"),))
    (reading,), picture = LiveReader(RATE_HZ, (ReadingSettings(),)).take(block, 1)
    assert reading.state is State.GAP
    assert reading.notes[0].kind is Kind.GAP
    assert dict(reading.notes[0].values) == {"at_s": 9000 / RATE_HZ, "why": "driver"}
    assert (reading.thdn, picture) == (None, None)


def test_a_gap_outside_the_block_does_not_matter() -> None:
    gaps = (Gap(0, 1000, "driver"), Gap(25_500, 10, "driver"))
    block = Capture(sine(24_500, RATE_HZ, 997.0, peak=0.5)[:, None], RATE_HZ, 1000, gaps=gaps)
    (reading,), _ = LiveReader(RATE_HZ, (ReadingSettings(),)).take(block)
    assert reading.state is State.OK


def test_an_overloaded_channel_is_withheld_and_the_other_is_read() -> None:
    tone = sine(24_500, RATE_HZ, 997.0)
    block = Capture(
        np.stack([np.clip(1.4 * tone, -1.0, 1.0), 0.5 * tone], axis=1),
        RATE_HZ,
        overloads=tuple(Overload(1, first, 20) for first in range(15, 24_000, 48)),
    )
    (first, second), picture = LiveReader(RATE_HZ, (ReadingSettings(), ReadingSettings())).take(block, 1)
    assert first.state is State.OVERLOAD
    assert first.notes[0].kind is Kind.OVERLOADED
    assert first.thdn is None
    assert first.level_fs is None
    assert first.peak_fs == pytest.approx(1.0, rel=1e-12, abs=0)
    assert second.state is State.OK
    assert picture is None or picture.reading is first  # a picture never makes an overload look like a reading


def test_hum_is_counted_once_beside_a_tone() -> None:
    frames = 24_500
    noise = np.random.default_rng(9).normal(0.0, 1e-5, frames)
    hum = 1e-3 * sine(frames, RATE_HZ, 50.02) + 3e-4 * sine(frames, RATE_HZ, 150.06, phase_rad=1.0)
    samples = sine(frames, RATE_HZ, 997.0, peak=0.5, harmonics={2: (1e-3, 0.0)}) + hum + noise
    (reading,), _ = LiveReader(RATE_HZ, (ReadingSettings(),)).take(capture(samples, rate_hz=RATE_HZ))
    assert reading.mains.frequency_hz == 50.0
    assert [line.frequency_hz for line in reading.mains.lines] == [50.0, 150.0]
    hum_ratio, noise_ratio = math.hypot(2e-3, 6e-4), 1e-5 * math.sqrt(2.0 * 19_980.0 / 48_000.0) / 0.5
    assert value(reading.hum) == pytest.approx(hum_ratio, rel=0.02, abs=0)
    assert value(reading.thdn) == pytest.approx(math.hypot(1e-3, hum_ratio, noise_ratio), rel=0.005, abs=0)
    # what a tapered block leaves of a line beyond four bins, 1 % of its power, stays in the noise
    assert value(reading.noise) < math.hypot(noise_ratio, 0.15 * hum_ratio)
    parts = math.hypot(value(reading.thd), value(reading.hum), value(reading.noise))
    assert parts == pytest.approx(value(reading.thdn), rel=1e-12, abs=0)


@pytest.mark.parametrize("noise", [0.0, 1e-5])
def test_silence_is_no_tone_with_level_noise_and_hum(noise: float) -> None:
    rng = np.random.default_rng(5)
    samples = rng.normal(0.0, 1.0, 24_500) * noise + 1e-4 * sine(24_500, RATE_HZ, 50.0)
    reader = LiveReader(RATE_HZ, (ReadingSettings(low_hz=20.0),))
    if noise:
        (reading,), _ = reader.take(capture(rng.normal(0.0, noise, 24_500), rate_hz=RATE_HZ))
        assert reading.state is State.NO_TONE
        assert (reading.thdn, reading.thd, reading.fundamental_fs) == (None, None, None)
        assert value(reading.level_fs) > 0.0
        assert value(reading.noise) > 0.9
    else:
        (reading,), _ = reader.take(capture(np.zeros(24_500), rate_hz=RATE_HZ))
        assert reading.state is State.NO_TONE
    reader.restart(997.0)
    (humming,), _ = reader.take(capture(samples, rate_hz=RATE_HZ))
    assert humming.state is State.NO_TONE  # asked for a tone near 997 Hz, found hum
    assert humming.mains.frequency_hz == 50.0
    assert value(humming.hum) > 0.9


def test_too_few_cycles_are_refused() -> None:
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    reader.take(capture(sine(48_000, RATE_HZ, 40.0, peak=0.5), rate_hz=RATE_HZ))
    (reading,), _ = reader.take(capture(sine(4800, RATE_HZ, 40.0, peak=0.5), rate_hz=RATE_HZ))
    assert reading.state is State.TOO_SHORT
    assert reader.next_frames >= LEAST_CYCLES / 40.0 * RATE_HZ * 0.99


def test_a_new_tone_is_found_again() -> None:
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    states = []
    for hz in (997.0, 997.0, 2500.0, 2500.0, 2500.0):
        (reading,), _ = reader.take(capture(sine(24_500, RATE_HZ, hz, peak=0.5), rate_hz=RATE_HZ))
        states.append(reading.state)
    assert states[:2] == [State.OK, State.OK]
    assert states[-1] is State.OK
    assert value(reading.fundamental_hz) == pytest.approx(2500.0, rel=1e-9, abs=0)


def test_the_tone_that_vanishes_is_not_read_from_noise() -> None:
    rng = np.random.default_rng(6)
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    reader.take(capture(sine(24_500, RATE_HZ, 997.0, peak=0.5), rate_hz=RATE_HZ))
    for _ in range(5):
        (reading,), _ = reader.take(capture(rng.normal(0.0, 1e-5, 24_500), rate_hz=RATE_HZ))
        assert reading.state is not State.OK
    assert reading.state is State.NO_TONE
    (again,), _ = reader.take(capture(sine(24_500, RATE_HZ, 1200.0, peak=0.5), rate_hz=RATE_HZ))
    assert again.state is State.OK


@pytest.mark.parametrize("frequency_hz", [20.0, 31.5, 997.0, 6650.0, 19_990.0])
def test_tones_of_the_whole_band_are_read_live(frequency_hz: float) -> None:
    reader = LiveReader(RATE_HZ, (ReadingSettings(),))
    readings = []
    for number in range(4):
        frames = reader.next_frames
        samples = sine(frames, RATE_HZ, frequency_hz, peak=0.5, start_frame=number * frames)
        (reading,), _ = reader.take(capture(samples, rate_hz=RATE_HZ, first_frame=number * frames))
        readings.append(reading)
    assert readings[-1].state is State.OK
    assert value(readings[-1].fundamental_fs) == pytest.approx(0.5, rel=1e-7, abs=0)
    assert db(value(readings[-1].thdn)) < -140.0


def test_a_reading_and_its_picture_stay_what_they_were_when_the_next_block_is_read() -> None:
    reader = LiveReader(RATE_HZ, (ReadingSettings(), ReadingSettings()))
    frames = reader.next_frames
    blocks = [
        capture(sine(frames, RATE_HZ, 997.0, peak=peak), sine(frames, RATE_HZ, 997.0, peak=0.1), rate_hz=RATE_HZ)
        for peak in (0.5, 0.2)
    ]
    given = blocks[0].samples.copy()
    readings, picture = reader.take(blocks[0], 1)
    assert picture is not None
    kept = [array.copy() for array in (picture.residual, picture.output, picture.spectrum_ratio)]
    said = repr(readings)
    reader.take(blocks[1], 1)
    for before, now in zip(kept, (picture.residual, picture.output, picture.spectrum_ratio), strict=True):
        np.testing.assert_array_equal(now, before)
    assert repr(readings) == said
    np.testing.assert_array_equal(blocks[0].samples, given)
