"""Hostile input to `wattproof read`: one line that names the file or option and the way out, in bounds.

Bounds: 5 s of processor time and 2 GiB of address space, set by the shell's `ulimit`; a run that hangs fails by its
deadline, which is wide so that a busy machine fails nobody.
"""

import json
import math
import os
import struct
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
import soundfile

from wattproof.__main__ import main
from wattproof.core.signal import Samples
from wattproof.signals.tone import sine

RATE_HZ = 48_000
PROGRAM = (sys.executable, "-m", "wattproof", "read")
BOUNDED = ("sh", "-c", 'ulimit -t 5; ulimit -v 2097152; exec "$@"', "sh")
HANGS_S = 60
Place = Callable[[Path], Path]


def read(
    *arguments: str | bytes | Path, redirect: str = "", env: dict[str, str] | None = None
) -> subprocess.CompletedProcess[bytes]:
    command = [*BOUNDED[:2], BOUNDED[2] + redirect, BOUNDED[3], *PROGRAM, *arguments]
    return subprocess.run(
        command,
        capture_output=True,
        check=False,
        timeout=HANGS_S,
        stdin=subprocess.DEVNULL,
        env=os.environ | (env or {}),
    )


def one_line_of(done: subprocess.CompletedProcess[bytes]) -> str:
    text = done.stderr.decode()
    assert text.count("\n") == 1, text
    assert text.endswith("\n")
    assert "Traceback" not in text
    return text


def tone() -> Samples:
    """Return a second of a sine of half full scale."""
    return sine(997.0, RATE_HZ, 0, RATE_HZ) / 2


def sound_file(path: Path, **given: str) -> Path:
    soundfile.write(path, tone(), RATE_HZ, **({"subtype": "PCM_24"} | given))
    return path


def wav_bytes(frames: int = 480, rate_hz: int = RATE_HZ, *, data_bytes: int | None = None, bits: int = 16) -> bytes:
    """Return a mono WAV written by hand, whose header may promise more than there is (RIFF, Microsoft 1991)."""
    payload = bytes(frames * bits // 8)
    promised = len(payload) if data_bytes is None else data_bytes
    block = bits // 8
    form = struct.pack("<4sIHHIIHH", b"fmt ", 16, 1, 1, rate_hz, (rate_hz * block) & 0xFFFFFFFF, block, bits)
    size = min(promised + 36, 0xFFFFFFFF)
    return struct.pack("<4sI4s", b"RIFF", size, b"WAVE") + form + struct.pack("<4sI", b"data", promised) + payload


def written(content: bytes) -> Place:
    def place(path: Path) -> Path:
        path.write_bytes(content)
        return path

    return place


def floats(value: float) -> Place:
    def place(path: Path) -> Path:
        samples = tone()
        samples[1000] = value
        soundfile.write(path, samples, RATE_HZ, subtype="FLOAT")
        return path

    return place


def folder(path: Path) -> Path:
    path.mkdir()
    return path


def pipe_without_end(path: Path) -> Path:
    os.mkfifo(path)
    return path


def link_loop(path: Path) -> Path:
    path.symlink_to(path.with_name("other.wav"))
    path.with_name("other.wav").symlink_to(path)
    return path


REFUSED: dict[str, Place] = {
    "no such file": lambda path: path,
    "empty": written(b""),
    "no samples": written(wav_bytes(0)),
    "cut off inside its header": written(wav_bytes()[:30]),
    "text": written(b"This is no sound.\n" * 100),
    "zeros": written(bytes(100_000)),
    "rate below 1 kHz": written(wav_bytes(rate_hz=999)),
    "rate of zero": written(wav_bytes(rate_hz=0)),
    "rate above 10 MHz": written(wav_bytes(rate_hz=10_000_001)),
    "NaN": floats(math.nan),
    "infinity": floats(math.inf),
    "beyond a million": floats(1.1e6),
    "folder": folder,
    "pipe that never ends": pipe_without_end,
    "link loop": link_loop,
}


def placed(places: dict[str, Place], root: Path) -> list[Path]:
    """Make one hostile file of each kind, each in a folder that is called like its kind."""
    paths = []
    for kind, place in places.items():
        (root / kind).mkdir()
        paths.append(place(root / kind / "tag 99.wav"))
    return paths


@pytest.fixture(scope="module")
def refusals(tmp_path_factory: pytest.TempPathFactory) -> list[str]:
    """The lines of one call, inside the bounds of one call, that reads all that cannot be read."""
    done = read(*placed(REFUSED, tmp_path_factory.mktemp("refused")))
    assert done.stdout == b""
    assert done.returncode == 2
    return done.stderr.decode().splitlines()


def test_nothing_is_said_but_one_line_for_each_file(refusals: list[str]) -> None:
    assert len(refusals) == len(REFUSED)


@pytest.mark.parametrize("kind", REFUSED)
def test_a_file_that_cannot_be_read_is_one_line_that_names_it(refusals: list[str], kind: str) -> None:
    (line,) = [line for line in refusals if f"/{kind}/tag 99.wav" in line]
    assert line.startswith("wattproof: ")
    said, way_out = line.split("tag 99.wav", maxsplit=1)[1].rsplit("; ", maxsplit=1)
    assert said
    assert way_out


def test_a_single_file_that_cannot_be_read_is_one_line_and_nothing_else(tmp_path: Path) -> None:
    done = read(tmp_path / "gone.wav")
    assert "gone.wav" in one_line_of(done)
    assert (done.stdout, done.returncode) == (b"", 2)


def test_a_device_that_never_ends_is_no_recording() -> None:
    done = read("/dev/zero")
    assert "/dev/zero" in one_line_of(done)
    assert done.returncode == 2


def test_a_file_that_may_not_be_read_is_one_line(tmp_path: Path) -> None:
    path = sound_file(tmp_path / "mine.wav")
    path.chmod(0)
    as_nobody = (  # root may read anything, so it steps down first, with everything loaded
        "import os, sys, soundfile, wattproof.cli.read; from wattproof.__main__ import main\n"
        "if os.geteuid() == 0: os.seteuid(65534)\n"
        "sys.exit(main(['read', sys.argv[1]]))"
    )
    done = subprocess.run(
        [sys.executable, "-c", as_nobody, path],
        capture_output=True,
        check=False,
        timeout=HANGS_S,
        stdin=subprocess.DEVNULL,
    )
    assert "mine.wav" in one_line_of(done)
    assert done.returncode == 2


def promising_4_gb(path: Path) -> Path:
    path.write_bytes(wav_bytes(RATE_HZ, data_bytes=0xFFFFFFF0))
    return path


def cut_short(name: str) -> Place:
    def place(path: Path) -> Path:
        whole = sound_file(path.with_name(name)).read_bytes()
        path = path.with_name(name)
        path.write_bytes(whole[: len(whole) * 2 // 3])
        return path

    return place


def flipped_bits(name: str) -> Place:
    def place(path: Path) -> Path:
        path = sound_file(path.with_name(name))
        content = bytearray(path.read_bytes())
        for position in range(len(content) // 2, len(content) // 2 + 4000, 97):
            content[position] ^= 0x5A
        path.write_bytes(content)
        return path

    return place


def renamed(path: Path) -> Path:
    sound_file(path.with_suffix(".flac")).rename(path)
    return path


DAMAGED: dict[str, Place] = {
    "header that promises 4 GB": promising_4_gb,
    "WAV cut short": cut_short("cut.wav"),
    "FLAC cut short": cut_short("cut.flac"),
    "FLAC with flipped bits": flipped_bits("flipped.flac"),
    "FLAC named WAV": renamed,
}


@pytest.fixture(scope="module")
def damaged(tmp_path_factory: pytest.TempPathFactory) -> dict[str, dict[str, Any]]:
    """What one call says of each kind of damaged file."""
    done = read(*placed(DAMAGED, tmp_path_factory.mktemp("damaged")), "--json")
    files = json.loads(done.stdout)["files"]
    assert done.stderr.count(b"\n") == sum("error" in file for file in files)
    return dict(zip(DAMAGED, files, strict=True))


@pytest.mark.parametrize("kind", DAMAGED)
def test_what_is_damaged_is_never_a_plain_reading(damaged: dict[str, dict[str, Any]], kind: str) -> None:
    file = damaged[kind]
    assert f"/{kind}/" in file["source"]["file"]
    if "error" in file:
        assert f"/{kind}/" in file["error"]
    else:
        assert file["readings"]
        assert all(reading["notes"] for reading in file["readings"])


def test_the_other_files_are_still_read(tmp_path: Path) -> None:
    good = sound_file(tmp_path / "good.flac")
    gone = tmp_path / "gone.flac"
    done = read(good, gone, good, "--json")
    assert "gone.flac" in one_line_of(done)
    assert done.returncode == 2
    files = json.loads(done.stdout)["files"]
    assert [list(file) for file in files][1] == ["source", "error"]
    assert [file["readings"][0]["state"] for file in (files[0], files[2])] == ["ok", "ok"]


def test_a_name_may_be_any_bytes(tmp_path: Path) -> None:
    names = [b"tag \xff\xfe.wav", b"two\nlines.wav", b"\x1b[31mred.wav", b"-.wav", "Ω−é.wav".encode()]
    paths = [os.fsencode(tmp_path) + b"/" + name for name in names]
    missing = read(*paths)
    assert missing.returncode == 2
    assert missing.stderr.count(b"\n") == len(names)
    assert b"\x1b" not in missing.stderr
    for path in paths:
        sound_file(tmp_path / "plain.wav").rename(os.fsdecode(path))
    for arguments in (paths, [*paths, "--json"]):
        done = read(*arguments)
        assert (done.returncode, done.stderr) == (0, b"")
        assert b"\x1b" not in done.stdout
        assert done.stdout.count(b"two\\nlines.wav") == 1
        done.stdout.decode()


def test_a_c_locale_gets_ascii(tmp_path: Path) -> None:
    path = sound_file(tmp_path / "Ω.wav")
    done = read(path, "--full-scale-vrms", "40", "--load", "8", env={"LC_ALL": "C"})
    assert (done.returncode, done.stderr) == (0, b"")
    assert done.stdout.isascii()
    assert b"+- at 95 %" in done.stdout
    assert b"8 ohm" in done.stdout
    missing = read(tmp_path / "µ.wav", env={"LC_ALL": "C"})
    assert one_line_of(missing).isascii()


@pytest.mark.parametrize(
    ("redirect", "why"),
    [(" >&-", "standard output"), (" >/dev/full", "standard output")],
    ids=["closed", "full"],
)
@pytest.mark.parametrize("form", [[], ["--json"]], ids=["table", "json"])
def test_output_that_goes_nowhere_is_one_line(tmp_path: Path, redirect: str, why: str, form: list[str]) -> None:
    done = read(sound_file(tmp_path / "tag.wav"), *form, redirect=redirect)
    assert why in one_line_of(done)
    assert done.returncode == 2


def test_a_reader_that_goes_away_gets_no_traceback(tmp_path: Path) -> None:
    path = sound_file(tmp_path / "tag.wav")
    for_reading, for_writing = os.pipe()
    os.close(for_reading)
    done = subprocess.run([*PROGRAM, path], stdout=for_writing, stderr=subprocess.PIPE, check=False, timeout=HANGS_S)
    os.close(for_writing)
    assert "standard output" in done.stderr.decode()
    assert done.stderr.count(b"\n") == 1
    assert done.returncode == 2


@pytest.mark.parametrize(
    ("arguments", "named"),
    [
        (["--band", "nan-20000"], "--band"),
        (["--band", "-20-20000"], "--band"),
        (["--band", "20000-20"], "--band"),
        (["--band", "20-24001"], "tag.wav"),
        (["--band"], "--band"),
        (["--fundamental", "nan"], "--fundamental"),
        (["--fundamental", "-997"], "--fundamental"),
        (["--fundamental", "24000"], "tag.wav"),
        (["--reference", "peak"], "--reference"),
        (["--full-scale-vrms", "0"], "--full-scale-vrms"),
        (["--full-scale-vrms", "inf"], "--full-scale-vrms"),
        (["--full-scale-vrms", "1e300"], "--full-scale-vrms"),
        (["--load", "8"], "--full-scale-vrms"),
        (["--load", "-8", "--full-scale-vrms", "1"], "--load"),
        (["--start", "-1"], "--start"),
        (["--start", "1e300"], "--start"),
        (["--start", "99"], "tag.wav"),
        (["--seconds", "0"], "--seconds"),
        (["--seconds", "nan"], "--seconds"),
        (["--seconds", "1e-300"], "--seconds"),
        (["--channel", "0"], "--channel"),
        (["--channel", "2"], "tag.wav"),
        (["--channel", "left"], "--channel"),
        (["--bogus"], "--bogus"),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, list) else "",
)
def test_a_wrong_option_is_one_line_that_names_it(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], arguments: list[str], named: str
) -> None:
    path = sound_file(tmp_path / "tag.wav")
    assert main(["read", str(path), *arguments]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert named in err
    assert len(err) < 300 + len(str(path))


def test_no_file_is_one_line(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["read"]) == 2
    out, err = capsys.readouterr()
    assert (out, err.count("\n")) == ("", 1)
    assert "FILE" in err
