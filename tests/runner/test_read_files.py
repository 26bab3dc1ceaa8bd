"""Recordings are read in order, several at a time, and what stands in the way of one does not stop the others."""

import threading
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import soundfile

from wattproof.core.notes import Kind, note
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture
from wattproof.runner.read_files import FileRead, FileRefused, Wanted, read_file, read_files

Write = Callable[..., str]
RATE_HZ = 8000


def level_reader(
    capture: Capture,
    settings: ReadingSettings,
    *,
    fundamental_hz: float | None = None,
    channels: tuple[int, ...] | None = None,
) -> tuple[Reading, ...]:
    """Read the rms level and nothing else, by the definition of it: a reader that behaves, and is quick."""
    wanted = channels or tuple(range(1, capture.channels + 1))
    tone = None if fundamental_hz is None else measured(fundamental_hz, 0.0, "Hz")
    return tuple(
        Reading(
            span=capture.span,
            channel=channel,
            settings=settings,
            state=State.OK,
            notes=(note(Kind.NO_HARMONIC_IN_BAND),),
            fundamental_hz=tone,
            level_fs=measured(float(np.sqrt(2 * np.mean(capture.samples[:, channel - 1] ** 2))), 0.0, "1"),
        )
        for channel in wanted
    )


@pytest.fixture
def write(tmp_path: Path) -> Write:
    """Write a recording of constant channels and return its path."""

    def _write(name: str, *values: float, frames: int = 800) -> str:
        path = tmp_path / name
        soundfile.write(path, np.tile(values, (frames, 1)), RATE_HZ, format="WAV", subtype="FLOAT")
        return str(path)

    return _write


def levels_of(outcome: FileRead | FileRefused) -> list[float]:
    assert isinstance(outcome, FileRead), outcome
    return [reading.level_fs.value for reading in outcome.readings if reading.level_fs is not None]


def test_all_channels_are_read_and_the_source_describes_the_whole_file(write: Write) -> None:
    path = write("two.wav", 0.25, 0.5)
    outcome = read_file(path, Wanted(start_s=0.05, seconds=0.02), level_reader)
    assert isinstance(outcome, FileRead)
    assert levels_of(outcome) == pytest.approx([0.25 * 2**0.5, 0.5 * 2**0.5], rel=1e-6, abs=0)
    source = outcome.source
    assert (source.file, source.rate_hz, source.frames, source.channels) == (path, RATE_HZ, 800, 2)
    assert outcome.readings[0].span.start_s == pytest.approx(0.05, rel=0, abs=1e-12)
    assert outcome.readings[0].span.seconds == pytest.approx(0.02, rel=0, abs=1e-12)


def test_one_channel_and_a_given_fundamental_are_passed_on(write: Write) -> None:
    outcome = read_file(write("two.wav", 0.25, 0.5), Wanted(channel=2, fundamental_hz=440.0), level_reader)
    assert isinstance(outcome, FileRead)
    assert [reading.channel for reading in outcome.readings] == [2]
    assert outcome.readings[0].fundamental_hz == measured(440.0, 0.0, "Hz")


def test_what_is_odd_about_the_file_is_said_before_what_is_odd_about_the_sound(write: Write) -> None:
    path = Path(write("cut.wav", 0.25))
    path.write_bytes(path.read_bytes()[:-400])
    outcome = read_file(str(path), Wanted(), level_reader)
    assert isinstance(outcome, FileRead)
    kinds = [each.kind for each in outcome.readings[0].notes]
    assert kinds[-1] is Kind.NO_HARMONIC_IN_BAND
    assert Kind.CUT_SHORT in kinds[:-1]


@pytest.mark.parametrize(
    ("wanted", "why"),
    [
        (Wanted(channel=3), "it has 2 channels, no channel 3"),
        (Wanted(fundamental_hz=4000.0), "half its rate is 4000 Hz"),
        (Wanted(settings=ReadingSettings(20.0, 4000.5), band_given=True), "half its rate is 4000 Hz"),
        (Wanted(start_s=5.0), "5"),
    ],
    ids=["channel", "fundamental", "band", "start"],
)
def test_what_the_file_cannot_give_is_refused_by_name(write: Write, wanted: Wanted, why: str) -> None:
    path = write("two.wav", 0.25, 0.5)
    outcome = read_file(path, wanted, level_reader)
    assert isinstance(outcome, FileRefused)
    assert outcome.file == path
    assert "two.wav" in outcome.why
    assert why in outcome.why


def test_a_band_that_nobody_asked_for_is_no_reason_to_refuse(write: Write) -> None:
    assert isinstance(read_file(write("one.wav", 0.25), Wanted(), level_reader), FileRead)


def test_a_band_that_ends_at_half_the_rate_is_in_the_file(write: Write) -> None:
    wanted = Wanted(settings=ReadingSettings(20.0, RATE_HZ / 2), band_given=True)
    assert isinstance(read_file(write("one.wav", 0.25), wanted, level_reader), FileRead)


def test_files_come_back_in_order_and_the_bad_ones_stop_nobody(write: Write, tmp_path: Path) -> None:
    levels = [k / 32 for k in range(1, 13)]
    paths = [write(f"{k}.wav", level) for k, level in enumerate(levels)]
    paths[3:3] = [str(tmp_path / "gone.wav")]
    outcomes = list(read_files(paths, Wanted(), level_reader))
    assert isinstance(outcomes[3], FileRefused)
    assert outcomes[3].file == paths[3]
    read = [levels_of(outcome)[0] for outcome in outcomes if isinstance(outcome, FileRead)]
    assert read == pytest.approx([level * 2**0.5 for level in levels], rel=1e-6, abs=0)


def test_two_files_are_read_at_the_same_time(write: Write, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("os.cpu_count", lambda: 2)
    both = threading.Barrier(2, timeout=60)

    def meeting_reader(
        capture: Capture,
        settings: ReadingSettings,
        *,
        fundamental_hz: float | None = None,
        channels: tuple[int, ...] | None = None,
    ) -> tuple[Reading, ...]:
        both.wait()  # breaks, and fails the test, where one file waits for the other
        return level_reader(capture, settings, fundamental_hz=fundamental_hz, channels=channels)

    outcomes = list(read_files([write("a.wav", 0.5), write("b.wav", 0.25)], Wanted(), meeting_reader))
    assert [levels_of(outcome)[0] for outcome in outcomes] == pytest.approx(
        [0.5 * 2**0.5, 0.25 * 2**0.5], rel=1e-6, abs=0
    )


def test_a_file_too_large_for_the_memory_is_refused_with_the_way_out(write: Write) -> None:
    def hungry_reader(
        capture: Capture,
        settings: ReadingSettings,
        *,
        fundamental_hz: float | None = None,
        channels: tuple[int, ...] | None = None,
    ) -> tuple[Reading, ...]:
        np.ones((2**50, capture.channels))  # 8 PiB: more than any address space, so the system refuses it at once
        return level_reader(capture, settings, fundamental_hz=fundamental_hz, channels=channels)

    outcome = read_file(write("one.wav", 0.25), Wanted(), hungry_reader)
    assert isinstance(outcome, FileRefused)
    assert "does not fit into memory; read a part" in outcome.why


def test_what_a_sound_file_cannot_be_read_as_is_refused_and_stops_nobody(write: Write) -> None:
    def fastidious_reader(
        capture: Capture,
        settings: ReadingSettings,
        *,
        fundamental_hz: float | None = None,
        channels: tuple[int, ...] | None = None,
    ) -> tuple[Reading, ...]:
        if capture.channels == 1:
            raise ValueError("no line fits into the band")
        return level_reader(capture, settings, fundamental_hz=fundamental_hz, channels=channels)

    one, two = read_files([write("one.wav", 0.5), write("two.wav", 0.5, 0.5)], Wanted(), fastidious_reader)
    assert isinstance(one, FileRefused)
    assert "one.wav: it can't be read as asked (no line fits into the band); ask for a wider band" in one.why
    assert isinstance(two, FileRead)
