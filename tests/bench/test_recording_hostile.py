"""Hostile and damaged files: refused in one line, or read with a note; never an unexpected error or a plain reading."""

import contextlib
import os
import resource
import struct
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.bench.sounds import RATE_HZ, encoded, flipped, tone
from wattproof.bench.recording import ogg
from wattproof.bench.recording.flac import crc8
from wattproof.bench.recording.sound_file import SoundFileContent, open_sound, printable
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Kind

Write = Callable[[str, bytes], Path]


@pytest.fixture
def write(tmp_path: Path) -> Write:
    def written(name: str, content: bytes) -> Path:
        path = tmp_path / name
        path.write_bytes(content)
        return path

    return written


def refusal(path: Path | str, **given_options: float) -> str:
    with pytest.raises(WrongUseError) as caught:
        open_sound(path, **given_options)
    line = str(caught.value)
    assert line.isascii()
    assert line.isprintable()
    assert line.startswith(printable(path))
    return line


def kinds(path: Path) -> list[Kind]:
    return [note.kind for note in open_sound(path).notes]


def wav(data: bytes, *, rate_hz: int = RATE_HZ, **wrong: int) -> bytes:
    """Return a mono 16-bit WAV file; `wrong` replaces what its header says."""
    said = {"riff": 36 + len(data), "rate": rate_hz, "bytes_per_s": rate_hz * 2, "align": 2, "bits": 16, "channels": 1}
    said |= {"data_bytes": len(data)} | wrong
    form = struct.pack("<HHIIHH", 1, said["channels"], said["rate"], said["bytes_per_s"], said["align"], said["bits"])
    head = struct.pack("<4sI4s4sI", b"RIFF", said["riff"], b"WAVE", b"fmt ", 16)
    return head + form + struct.pack("<4sI", b"data", said["data_bytes"]) + data


SOUND = (tone(0.2, 1)[:, 0] * 32768).astype("<i2").tobytes()


def test_what_is_no_sound_file_is_refused(write: Write, tmp_path: Path) -> None:
    assert "there is no such file" in refusal(tmp_path / "none.wav")
    assert "is empty" in refusal(write("empty.wav", b""))
    assert "no readable sound file" in refusal(write("text.wav", b"This is no sound.\n" * 50))
    assert "no readable sound file" in refusal(write("zeros.raw", bytes(5000)))
    assert "no samples" in refusal(write("none.wav", wav(b"")))
    assert "a folder" in refusal(tmp_path)
    assert "below 2 GiB" in refusal(sparse(tmp_path / "huge.wav", wav(SOUND), 5 << 30))


def sparse(path: Path, content: bytes, size: int) -> Path:
    with path.open("wb") as file:
        file.write(content)
        file.truncate(size)
    return path


def test_what_never_ends_is_refused_without_opening_it(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe.wav"
    os.mkfifo(pipe)
    assert "pipe or device" in refusal(pipe)
    assert "pipe or device" in refusal("/dev/zero")


def test_a_link_loop_is_refused(tmp_path: Path) -> None:
    loop = tmp_path / "loop.wav"
    loop.symlink_to(loop)
    assert "cannot be opened" in refusal(loop)


def test_missing_permission_is_refused(write: Write, monkeypatch: pytest.MonkeyPatch) -> None:
    path = write("mine.wav", wav(SOUND))

    def denied(*_: object) -> int:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(os, "open", denied)  # permission bits do not bind root, who runs tests in containers
    assert "no permission" in refusal(path)


@pytest.mark.parametrize("name", [b"caf\xc3\xa9.wav", b"\xff\xfe\x01\n\x1b[31m.wav", "Ω \u202e.wav".encode()])
def test_names_of_any_bytes_are_shown_in_ascii(tmp_path: Path, name: bytes) -> None:
    path = os.fsdecode(os.fsencode(tmp_path) + b"/" + name)
    assert "no such file" in refusal(path)
    Path(path).write_bytes(wav(SOUND))
    assert open_sound(path).notes == ()
    assert "cannot be opened" in refusal("a\0b.wav")
    assert "cannot be opened" in refusal("long" * 2000)


@pytest.mark.parametrize("rate_hz", [0, 999, 10_000_001, 2**31])
def test_rates_that_no_interface_has_are_refused(write: Write, rate_hz: int) -> None:
    path = write("rate.wav", wav(SOUND, rate=rate_hz, bytes_per_s=rate_hz * 2 & 0xFFFFFFFF))
    line = refusal(path)
    assert "its rate is" in line or "no readable sound file" in line


def test_a_header_that_promises_4_gb_is_refused_and_costs_nothing(write: Write) -> None:
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    for content in (
        wav(SOUND, riff=0xFFFFFFF0, data_bytes=0xFFFFFFF0 - 36),
        wav(SOUND, riff=0xFFFFFFFF, data_bytes=0xFFFFFFFF),
    ):
        assert "its header promises 42949" in refusal(write("lie.wav", content))
    assert resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before < 100_000  # kB


@pytest.mark.parametrize("value", [np.nan, np.inf, -np.inf, 1.1e6, -1e30])
def test_samples_that_are_no_sound_are_refused(write: Write, value: float) -> None:
    samples = tone(0.5)
    samples[1000, 1] = value
    line = refusal(write("odd.wav", encoded("WAV", "DOUBLE", samples)))
    assert "no numbers" in line or "times full scale" in line


@pytest.mark.parametrize("form", ["WAV", "RF64", "W64", "AIFF"])
def test_a_file_cut_short_says_how_much_is_there(write: Write, form: str) -> None:
    content = encoded(form, "PCM_24")
    path = write("cut." + form.lower(), content[: len(content) // 2])
    notes = open_sound(path).notes
    assert [note.kind for note in notes] == [Kind.CUT_SHORT]
    values = dict(notes[0].values)
    assert values["promised_frames"] == RATE_HZ
    assert 0.48 * RATE_HZ < float(values["frames"]) < 0.5 * RATE_HZ


def test_a_flac_file_cut_short_is_read_up_to_there(write: Write) -> None:
    content = encoded("FLAC", "PCM_24")
    opened = open_sound(write("cut.flac", content[: len(content) // 2]))
    assert [note.kind for note in opened.notes] == [Kind.CUT_SHORT]
    assert 0.3 * RATE_HZ < opened.capture.frames < 0.5 * RATE_HZ
    np.testing.assert_allclose(opened.capture.samples, tone()[: opened.capture.frames], rtol=0.0, atol=2.0**-23)


@pytest.mark.parametrize(
    ("form", "subtype", "suffix"),
    [
        ("OGG", "VORBIS", "ogg"),
        ("MP3", "MPEG_LAYER_III", "mp3"),
        ("AU", "PCM_16", "au"),
        ("CAF", "PCM_16", "caf"),
        ("MAT5", "PCM_16", "mat"),
        ("VOC", "PCM_16", "voc"),
        ("AVR", "PCM_16", "avr"),
        ("SVX", "PCM_16", "svx"),
    ],
)
def test_any_other_file_cut_short_is_no_plain_reading(write: Write, form: str, subtype: str, suffix: str) -> None:
    content = encoded(form, subtype, tone(2.0, 1 if form == "SVX" else 2))
    with contextlib.suppress(WrongUseError):
        assert kinds(write("cut." + suffix, content[: len(content) * 2 // 3]))


def test_a_flac_file_with_a_turned_bit_is_no_plain_reading(write: Write) -> None:
    content = encoded("FLAC", "PCM_16")
    for position in range(8, len(content), 997):
        with contextlib.suppress(WrongUseError):
            found = kinds(write("bits.flac", flipped(content, position)))
            assert found
            assert set(found) <= {Kind.DAMAGED, Kind.CUT_SHORT}


def test_damage_inside_a_flac_file_is_not_called_cut_short(write: Write) -> None:
    content = encoded("FLAC", "PCM_16")
    assert kinds(write("bits.flac", flipped(content, len(content) // 2))) == [Kind.DAMAGED]


def test_another_rate_in_a_flac_header_is_damage(write: Write) -> None:
    # STREAMINFO's rate stands in 20 bits from byte 18 of the file on (RFC 9639, 8.2): 48,000 Hz becomes 48,001 Hz
    assert kinds(write("rate.flac", flipped(encoded("FLAC", "PCM_16"), 20, 4))) == [Kind.DAMAGED]


def test_an_ogg_file_with_a_turned_bit_is_no_plain_reading(write: Write) -> None:
    content = encoded("OGG", "VORBIS")
    for position in range(100, len(content), 499):
        with contextlib.suppress(WrongUseError):
            assert Kind.DAMAGED in kinds(write("bits.ogg", flipped(content, position)))


@pytest.mark.parametrize(
    "wrong", [{"bytes_per_s": 999}, {"align": 3}, {"bits": 24}, {"riff": 1000}, {"data_bytes": 1001}, {"rate": 48_001}]
)
def test_a_wav_header_that_contradicts_itself_is_no_plain_reading(write: Write, wrong: dict[str, int]) -> None:
    assert kinds(write("good.wav", wav(SOUND))) == []
    with contextlib.suppress(WrongUseError):
        assert Kind.DAMAGED in kinds(write("wrong.wav", wav(SOUND, **wrong)))


def test_what_follows_the_end_is_noted(write: Write) -> None:
    assert kinds(write("long.wav", wav(SOUND) + b"tail" * 10)) == [Kind.DAMAGED]


def test_nothing_reaches_standard_error(write: Write) -> None:
    content = encoded("MP3", "MPEG_LAYER_III")
    path = write("cut.mp3", content[: len(content) // 2])
    code = "import sys; from wattproof.bench.recording import open_sound; print(open_sound(sys.argv[1]).notes)"
    done = subprocess.run([sys.executable, "-c", code, path], capture_output=True, check=True)
    assert b"CUT_SHORT" in done.stdout
    assert done.stderr == b""


def test_the_checksums_are_those_of_the_standards() -> None:
    # CRC-8/SMBUS has FLAC's polynomial and start; its check value over "123456789" is 0xF4, and that of the 32-bit
    # polynomial 0x04c11db7 starting at 0, not inverted, is 0x89A1897F (Koopman, CRC check values of "123456789")
    assert crc8(b"123456789") == 0xF4
    assert ogg.checksum(b"123456789") == 0x89A1897F


SEEDS = {
    "wav": encoded("WAV", "PCM_16", tone(0.1)),
    "flac": encoded("FLAC", "PCM_16", tone(0.3)),
    "ogg": encoded("OGG", "VORBIS", tone(0.1)),
    "aiff": encoded("AIFF", "PCM_16", tone(0.1)),
    "w64": encoded("W64", "PCM_16", tone(0.1)),
}
CHANGES = st.lists(st.tuples(st.floats(0.0, 1.0), st.integers(0, 255)), max_size=6)
HEADER_CHANGES = st.lists(st.tuples(st.integers(0, 90), st.integers(0, 255)), max_size=6)


def survives(path: Path, content: bytes) -> SoundFileContent | None:
    path.write_bytes(content)
    try:
        return open_sound(path)
    except WrongUseError as error:
        line = str(error)
    assert line.isascii()
    assert line.isprintable()
    return None


@pytest.mark.parametrize("suffix", SEEDS)
@settings(max_examples=120, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(keep=st.floats(0.0, 1.0), changes=CHANGES, header=HEADER_CHANGES)
def test_no_damage_raises_anything_unexpected(
    tmp_path: Path, suffix: str, keep: float, changes: list[tuple[float, int]], header: list[tuple[int, int]]
) -> None:
    content = bytearray(SEEDS[suffix])
    places = [(int(place * (len(content) - 1)), value) for place, value in changes] + header
    for position, value in places:
        content[position] = value
    opened = survives(tmp_path / f"damaged.{suffix}", bytes(content[: round(keep * len(content))]))
    if opened is not None:
        assert opened.capture.samples.size > 0
        assert np.isfinite(opened.capture.samples).all()


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(keep=st.integers(1, 4000), suffix=st.sampled_from(["wav", "flac", "aiff", "w64"]))
def test_no_cut_is_a_plain_reading(tmp_path: Path, keep: int, suffix: str) -> None:
    opened = survives(tmp_path / f"cut.{suffix}", SEEDS[suffix][:keep])
    assert opened is None or opened.notes
