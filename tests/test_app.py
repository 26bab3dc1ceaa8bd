"""Benches are opened by what a person calls them, and the log goes where the platform wants it."""

import errno
import io
import logging
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
import soundfile

from wattproof import app
from wattproof.bench.simulated import CHARACTERS
from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.core.signal import Tone

LOGGER = logging.getLogger("wattproof")


@pytest.fixture
def log() -> Iterator[None]:
    handlers, propagate, level = LOGGER.handlers[:], LOGGER.propagate, LOGGER.level
    LOGGER.handlers.clear()
    yield
    app.close_log()
    LOGGER.handlers[:], LOGGER.propagate = handlers, propagate
    LOGGER.setLevel(level)


@pytest.fixture
def recording(tmp_path: Path) -> Path:
    path = tmp_path / "tone.flac"
    tone = 0.5 * np.sin(2.0 * np.pi * 997.0 / 48_000.0 * np.arange(48_000))
    soundfile.write(path, np.stack([tone, 0.5 * tone], axis=1), 48_000, subtype="PCM_24")
    return path


@pytest.mark.parametrize("text", ["simulated", *(f"simulated:{name}" for name in CHARACTERS)])
def test_a_simulated_amplifier_is_opened_by_its_name(text: str) -> None:
    bench = app.open_bench(text, "free")
    assert bench.identity.name == (text if ":" in text else f"simulated:{CHARACTERS[0]}")
    assert not bench.identity.real
    assert bench.next_frame == 0
    bench.close()


def test_a_recording_is_opened_by_its_path_and_watched_without_a_tone(recording: Path) -> None:
    runner = app.make_watch_runner(app.open_bench(str(recording), "free"))
    try:
        assert runner.outputs == ()
        assert not runner.wishes.tone_on
        with pytest.raises(WrongUseError, match="no output"):
            runner.wish(tone_on=True)
    finally:
        runner.close()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("simulated:nope", "class-a-single"),
        ("", "no bench is named; give simulated, simulated:NAME"),
        ("  ", "no bench is named"),
    ],
)
def test_what_cannot_be_opened_is_one_line_with_the_way_out(text: str, said: str) -> None:
    with pytest.raises(WattproofError) as caught:
        app.open_bench(text)
    assert said in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_bench_that_cannot_be_watched_is_closed_again(monkeypatch: pytest.MonkeyPatch) -> None:
    opened = app.open_bench("simulated", "free")
    monkeypatch.setattr(app, "open_bench", lambda _: opened)
    monkeypatch.setattr(app, "make_watch_runner", lambda _: 1 / 0)
    with pytest.raises(ZeroDivisionError):
        app.open_watch("simulated")
    with pytest.raises(WattproofError, match="closed"):
        opened.play(Tone(997.0, 0.1))


@pytest.mark.usefixtures("log")
def test_the_log_is_a_bounded_file_in_the_platforms_folder() -> None:
    path = app.open_log()
    assert Path(path).parent == app.log_folder()
    assert app.open_log() == path
    LOGGER.info("a line with an Ω")
    assert "INFO wattproof: a line with an Ω" in Path(path).read_text(encoding="utf-8")
    (handler,) = LOGGER.handlers
    assert isinstance(handler, app.LogFile)
    assert 0 < handler.maxBytes * (handler.backupCount + 1) < 10e6


@pytest.mark.usefixtures("log")
def test_where_no_log_can_be_written_all_stays_quiet(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capfd: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "file").touch()
    monkeypatch.setattr(app, "log_folder", lambda: tmp_path / "file" / "below")
    assert app.open_log() == ""
    LOGGER.critical("nobody hears")
    assert capfd.readouterr() == ("", "")


class FullDisk(io.TextIOWrapper):
    """A file on a disk that takes no more."""

    def write(self, _: str) -> int:
        raise OSError(errno.ENOSPC, "No space left on device")


@pytest.mark.usefixtures("log")
def test_a_disk_that_takes_no_more_does_not_disturb(capfd: pytest.CaptureFixture[str]) -> None:
    app.open_log()
    (handler,) = LOGGER.handlers
    assert isinstance(handler, app.LogFile)
    log_file = handler.setStream(FullDisk(io.BytesIO()))
    assert log_file is not None
    LOGGER.critical("nobody hears")
    handler.setStream(log_file)
    assert capfd.readouterr() == ("", "")
