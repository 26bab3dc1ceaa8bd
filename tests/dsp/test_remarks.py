"""What a spectrum tells beside the reading: a carrier above the band, a second tone inside it."""

from collections.abc import Callable

import numpy as np
import pytest

from tests.dsp.waveforms import capture, read_ok, sine
from wattproof.core.notes import Kind, Note
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Samples
from wattproof.dsp.live import LiveReader

RATE_HZ = 192_000.0
Reader = Callable[[Samples, float], Reading]
FRAMES = 48_600


def _said(reading: Reading, kind: Kind) -> dict[str, float | str] | None:
    notes: list[Note] = [note for note in reading.notes if note.kind is kind]
    return dict(notes[0].values) if notes else None


def _live(samples: Samples, rate_hz: float) -> Reading:
    (reading,), _ = LiveReader(rate_hz, (ReadingSettings(),)).take(capture(samples, rate_hz=rate_hz))
    assert reading.state is State.OK
    return reading


@pytest.mark.parametrize("reader", [read_ok, _live])
@pytest.mark.parametrize(("carrier_hz", "carrier_db"), [(25_000.0, -30.0), (48_123.0, -38.0), (80_000.0, 0.0)])
def test_content_above_20_khz_over_minus_40_db_is_said(reader: Reader, carrier_hz: float, carrier_db: float) -> None:
    tone = sine(FRAMES, RATE_HZ, 997.0, peak=0.3)
    carrier = 0.3 * 10.0 ** (carrier_db / 20.0) * sine(FRAMES, RATE_HZ, carrier_hz)
    said = _said(reader(tone + carrier, RATE_HZ), Kind.CARRIER)
    assert said is not None
    assert said["db"] == pytest.approx(carrier_db, rel=0, abs=0.1)


@pytest.mark.parametrize("reader", [read_ok, _live])
def test_less_than_that_is_not_said(reader: Reader) -> None:
    tone = sine(FRAMES, RATE_HZ, 997.0, peak=0.3)
    faint = 0.3 * 10.0 ** (-42.0 / 20.0) * sine(FRAMES, RATE_HZ, 48_123.0)
    assert _said(reader(tone + faint, RATE_HZ), Kind.CARRIER) is None


@pytest.mark.parametrize("reader", [read_ok, _live])
def test_harmonics_above_20_khz_are_no_carrier(reader: Reader) -> None:
    square = {order: (1.0 / order, 0.0) for order in range(3, 95, 2)}  # harmonics to 93.7 kHz, −26 dB at 20 kHz
    reading = reader(sine(FRAMES, RATE_HZ, 997.0, peak=0.3, harmonics=square), RATE_HZ)
    assert _said(reading, Kind.CARRIER) is None


@pytest.mark.parametrize("carrier_db", [-60.0, -30.0, -6.0])
def test_a_carrier_does_not_count_in_the_band(carrier_db: float) -> None:
    tone = sine(FRAMES, RATE_HZ, 997.0, peak=0.3, harmonics={2: (1e-4, 0.0)})
    noise = np.random.default_rng(1).normal(0.0, 1e-6, FRAMES)
    carrier = 0.3 * 10.0 ** (carrier_db / 20.0) * sine(FRAMES, RATE_HZ, 61_234.0)
    without, beside = (read_ok(tone + noise + extra, RATE_HZ) for extra in (np.zeros(FRAMES), carrier))
    assert without.thdn is not None
    assert beside.thdn is not None
    assert 20.0 * np.log10(beside.thdn.value / without.thdn.value) == pytest.approx(0.0, rel=0, abs=0.01)


@pytest.mark.parametrize("ratio_db", [-60.0, -20.0])
def test_a_second_tone_is_named_and_counts_in_noise(ratio_db: float) -> None:
    noise = np.random.default_rng(1).normal(0.0, 1e-5, FRAMES)
    second = 0.3 * 10.0 ** (ratio_db / 20.0) * sine(FRAMES, RATE_HZ, 1301.7)
    reading = read_ok(sine(FRAMES, RATE_HZ, 997.0, peak=0.3) + second + noise, RATE_HZ)
    said = _said(reading, Kind.SECOND_TONE)
    assert said is not None
    assert said["frequency_hz"] == pytest.approx(1301.7, rel=0, abs=0.2)
    assert said["db"] == pytest.approx(ratio_db, rel=0, abs=0.1)
    assert reading.noise is not None
    ratio = 10.0 ** (ratio_db / 20.0)
    # a level counts in the total too; what else is noise is 62 dB lower at the least
    assert reading.noise.value == pytest.approx(ratio / np.hypot(1.0, ratio), rel=2e-3, abs=0)


def test_a_faint_line_among_noise_is_not_named() -> None:
    noise = np.random.default_rng(1).normal(0.0, 1e-3, FRAMES)
    second = 3e-5 * sine(FRAMES, RATE_HZ, 1301.7)
    assert read_ok(sine(FRAMES, RATE_HZ, 997.0, peak=0.3) + second + noise, RATE_HZ).notes == ()
