"""A recording played as if it were live."""

import threading
from pathlib import Path

import numpy as np
import pytest

from tests.bench.sounds import RATE_HZ, encoded, tone
from wattproof.bench.protocol import Bench
from wattproof.bench.recording import RecordingBench
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.signal import Tone

STOP = threading.Event()


@pytest.fixture
def path(tmp_path: Path) -> Path:
    path = tmp_path / "take.wav"
    path.write_bytes(encoded("WAV", "PCM_24"))
    return path


def opened(path: Path) -> RecordingBench:
    bench = RecordingBench(path, "free")
    bench.open()
    return bench


def test_it_is_a_bench_without_outputs_or_controls(path: Path) -> None:
    bench: Bench = RecordingBench(path, "free")
    assert (bench.identity.rate_hz, bench.identity.inputs, bench.identity.outputs) == (RATE_HZ, 2, 0)
    assert bench.controls == ()
    assert bench.calibration.inputs == ()
    with pytest.raises(WrongUseError, match="no controls"):
        bench.turn("knob", 1.0)


def test_blocks_are_the_files_own_frames_overlapping_or_not(path: Path) -> None:
    bench = opened(path)
    first = bench.capture(0, 10_000, STOP)
    again = bench.capture(5000, 10_000, STOP)
    np.testing.assert_allclose(first.samples, tone()[:10_000], rtol=0.0, atol=2.0**-23)
    assert np.array_equal(first.samples[5000:], again.samples[:5000])
    assert again.first_frame == 5000
    assert bench.next_frame == 15_000
    assert bench.play(Tone(997.0, 0.1)) == 15_000
    bench.close()


def test_past_its_end_the_bench_is_lost(path: Path) -> None:
    bench = opened(path)
    bench.capture(RATE_HZ - 100, 100, STOP)
    with pytest.raises(BenchLostError, match=r"the recording ended after 1\.00 s"):
        bench.capture(RATE_HZ - 100, 101, STOP)
    bench.close()


def test_closed_or_not_opened_it_is_lost(path: Path) -> None:
    with pytest.raises(BenchLostError, match="not open"):
        RecordingBench(path, "free").capture(0, 1, STOP)
    bench = opened(path)
    bench.close()
    bench.close()
    with pytest.raises(BenchLostError, match="not open"):
        bench.capture(0, 1, STOP)


def test_overloads_are_judged_at_the_files_full_scale(tmp_path: Path) -> None:
    path = tmp_path / "hot.wav"
    path.write_bytes(encoded("WAV", "PCM_16", np.clip(tone(peak=1.3), -1.0, 1.0)))
    bench = opened(path)
    block = bench.capture(4800, 4800, STOP)
    assert 190 <= len([run for run in block.overloads if run.channel == 1]) <= 210  # two a cycle of 99.7
    assert all(4800 <= run.first_frame < 9600 for run in block.overloads)
    bench.close()


def test_in_real_pace_frames_come_with_the_clock(path: Path) -> None:
    now_s = [50.0]

    class Passing(threading.Event):
        def wait(self, timeout: float | None = None) -> bool:
            now_s[0] += (timeout or 0.0) + 1e-5
            return self.is_set()

    bench = RecordingBench(path, "real", clock=lambda: now_s[0])
    bench.open()
    for index in range(5):
        bench.capture(index * 4800, 9600, Passing())
    assert 0.6 <= now_s[0] - 50.0 < 0.601
    bench.close()


def test_a_set_stop_event_ends_it(path: Path) -> None:
    stop = threading.Event()
    stop.set()
    for pace in ("free", "real"):
        bench = RecordingBench(path, pace)
        bench.open()
        with pytest.raises(StoppedError):
            bench.capture(0, 1000, stop)
        bench.close()


def test_a_file_that_cannot_be_read_is_refused_at_once(tmp_path: Path) -> None:
    with pytest.raises(WrongUseError, match="no such file"):
        RecordingBench(tmp_path / "none.wav", "free")
    (tmp_path / "text.wav").write_text("no sound")
    with pytest.raises(WrongUseError, match="no readable sound file"):
        RecordingBench(tmp_path / "text.wav", "free")


def test_a_recording_that_breaks_inside_is_lost_there(tmp_path: Path) -> None:
    content = bytearray(encoded("FLAC", "PCM_24"))
    content[len(content) // 2] ^= 4
    path = tmp_path / "broken.flac"
    path.write_bytes(content)
    bench = opened(path)
    assert bench.capture(0, 4096, STOP).frames == 4096
    with pytest.raises(BenchLostError, match="it is damaged"):
        bench.capture(0, RATE_HZ, STOP)
    bench.close()
