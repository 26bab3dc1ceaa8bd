"""Sound files are read as they are: samples, stretch, rails, digest, and no note where nothing is wrong."""

import hashlib
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from tests.bench.sounds import RATE_HZ, encoded, tone
from wattproof.bench.recording.sound_file import open_sound
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Kind

FORMS = [
    ("WAV", "PCM_16", ".wav", 16),
    ("WAV", "PCM_U8", ".wav", 8),
    ("WAV", "PCM_24", ".WAV", 24),
    ("WAV", "FLOAT", ".wav", None),
    ("WAV", "DOUBLE", ".wav", None),
    ("WAV", "ULAW", ".wav", None),
    ("WAVEX", "PCM_24", ".wav", 24),
    ("RF64", "PCM_24", ".rf64", 24),
    ("W64", "PCM_24", ".w64", 24),
    ("AIFF", "PCM_24", ".aiff", 24),
    ("AU", "PCM_16", ".au", 16),
    ("CAF", "PCM_24", ".caf", 24),
    ("FLAC", "PCM_16", ".flac", 16),
    ("FLAC", "PCM_24", ".flac", 24),
    ("FLAC", "PCM_S8", ".flac", 8),
    ("OGG", "VORBIS", ".ogg", None),
    ("OGG", "OPUS", ".opus", None),
    ("MP3", "MPEG_LAYER_III", ".mp3", None),
]


@pytest.mark.parametrize(("form", "subtype", "suffix", "bits"), FORMS)
def test_a_sound_file_is_read_without_a_note(
    tmp_path: Path, form: str, subtype: str, suffix: str, bits: int | None
) -> None:
    path = tmp_path / f"take{suffix}"
    path.write_bytes(encoded(form, subtype))
    content = open_sound(path)
    assert content.notes == ()
    assert (content.rate_hz, content.frames, content.channels) == (RATE_HZ, RATE_HZ, 2)
    assert (content.subtype, content.integer_bits) == (subtype, bits)
    assert content.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    if bits is not None:
        step = 2.0 ** (1 - bits)
        np.testing.assert_allclose(content.capture.samples, tone(), rtol=0.0, atol=step)
        assert np.array_equal(content.capture.samples, np.rint(content.capture.samples / step) * step)


def test_a_stretch_is_read_from_its_place(tmp_path: Path) -> None:
    for form, suffix in (("WAV", "wav"), ("FLAC", "flac")):
        path = tmp_path / f"take.{suffix}"
        path.write_bytes(encoded(form, "PCM_24"))
        whole = open_sound(path).capture.samples
        part = open_sound(path, start_s=0.25, seconds=0.5)
        assert part.capture.first_frame == RATE_HZ // 4
        assert np.array_equal(part.capture.samples, whole[RATE_HZ // 4 : 3 * RATE_HZ // 4])
        assert part.frames == RATE_HZ
        assert part.notes == ()


def test_what_is_longer_than_is_read_is_noted(tmp_path: Path) -> None:
    path = tmp_path / "take.wav"
    path.write_bytes(encoded("WAV", "PCM_16"))
    content = open_sound(path, most_seconds=0.5)
    assert [note.kind for note in content.notes] == [Kind.SHORTENED]
    assert dict(content.notes[0].values) == {"seconds": 0.5}
    assert [note.kind for note in open_sound(path, seconds=0.9, most_seconds=0.5).notes] == [Kind.SHORTENED]
    assert open_sound(path, seconds=5.0).notes == ()


def test_many_channels_are_read_for_a_shorter_time(tmp_path: Path) -> None:
    path = tmp_path / "wide.wav"
    path.write_bytes(encoded("WAV", "PCM_U8", np.zeros((20_000, 1024)), rate_hz=1_000_000))
    content = open_sound(path)
    assert content.capture.samples.size <= 12_000_000
    assert [note.kind for note in content.notes] == [Kind.SHORTENED]


@pytest.mark.parametrize(("form", "subtype", "suffix"), [("WAV", "PCM_16", "wav"), ("FLAC", "PCM_24", "flac")])
def test_runs_at_the_rails_are_told(tmp_path: Path, form: str, subtype: str, suffix: str) -> None:
    path = tmp_path / f"hot.{suffix}"
    path.write_bytes(encoded(form, subtype, np.clip(tone(peak=1.2), -1.0, 1.0)))
    overloads = open_sound(path).capture.overloads
    assert {run.channel for run in overloads} == {1}
    assert 1990 <= len(overloads) <= 1996  # two in each of 997 cycles, less those of noise at the edges
    assert all(run.frames >= 2 for run in overloads)


def test_float_samples_beyond_full_scale_stand_at_no_rail(tmp_path: Path) -> None:
    hot = tone(peak=1.2)
    path = tmp_path / "hot.wav"
    path.write_bytes(encoded("WAV", "FLOAT", np.clip(hot, -1.0, 1.0)))
    assert open_sound(path).capture.overloads
    path.write_bytes(encoded("WAV", "FLOAT", hot))
    assert open_sound(path).capture.overloads == ()


def test_another_format_renamed_is_noted(tmp_path: Path) -> None:
    path = tmp_path / "take.wav"
    path.write_bytes(encoded("FLAC", "PCM_16"))
    content = open_sound(path)
    assert [note.kind for note in content.notes] == [Kind.NOT_AS_NAMED]
    assert dict(content.notes[0].values) == {"named": ".wav", "found": "FLAC"}
    plain = tmp_path / "take"
    plain.write_bytes(encoded("FLAC", "PCM_16"))
    assert open_sound(plain).notes == ()


def test_a_headerless_name_does_not_hide_what_is_inside(tmp_path: Path) -> None:
    path = tmp_path / "take.raw"
    path.write_bytes(encoded("WAV", "PCM_16"))
    assert [note.kind for note in open_sound(path).notes] == [Kind.NOT_AS_NAMED]


def test_a_start_beyond_the_end_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "take.wav"
    path.write_bytes(encoded("WAV", "PCM_16"))
    with pytest.raises(WrongUseError, match=r"take\.wav: the start of 1 s lies beyond its end at 1 s"):
        open_sound(path, start_s=1.0)


def test_the_sound_library_is_not_loaded_before_a_file_is_read() -> None:
    code = "import sys, wattproof.bench.recording; sys.exit('soundfile' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
