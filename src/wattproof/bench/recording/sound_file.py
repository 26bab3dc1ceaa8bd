"""Opens a sound file with care: whatever it is, it is read in bounded time and memory, or refused in one line."""

import hashlib
import os
import stat
from pathlib import Path
from typing import Any, BinaryIO

import attrs
import numpy as np

from wattproof.bench.rails import integer_rails, rail_runs
from wattproof.bench.recording import flac
from wattproof.bench.recording.container import Container
from wattproof.bench.recording.decoder import Decoded, decode
from wattproof.bench.recording.structure import examine
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.signal import Capture, Overload, Samples

MOST_SAMPLES = 12_000_000  # 96 MB as float64: 62 s of stereo at 96 kHz; analysis needs as much again
LARGEST_BYTES = 2 << 30  # 90 min of 24-bit stereo at 48 kHz; hashing more would take longer than a person waits
LIE_BYTES = 1 << 30  # a header that promises so much more than there is was not cut short: it lies
LARGEST_SAMPLE = 1e6
NAMES = {
    "WAV": {".wav", ".wave", ".rf64", ".bwf"},
    "WAVEX": {".wav", ".wave", ".rf64", ".bwf"},
    "RF64": {".wav", ".wave", ".rf64", ".bwf"},
    "AIFF": {".aif", ".aiff", ".aifc"},
    "OGG": {".ogg", ".oga", ".opus", ".spx"},
    "FLAC": {".flac", ".fla"},
    "MP3": {".mp3", ".mp2", ".mp1"},
    "AU": {".au", ".snd"},
    "MAT4": {".mat"},
    "MAT5": {".mat"},
    "IRCAM": {".sf", ".ircam"},
    "NIST": {".sph", ".nist", ".wav"},
    "SVX": {".svx", ".8svx", ".16svx", ".iff"},
    "MPC2K": {".mpc", ".mpc2k", ".snd"},
}


@attrs.frozen(eq=False)
class SoundFileContent:
    """What was read of a file.

    `frames` are those of the whole file, `capture` holds the part that was asked for (its first_frame counts from the
    file's start) with every run of two frames and more at the format's rails. `integer_bits` is None for float and
    lossy formats. `notes` say what keeps the file from being sound.
    """

    path: str
    rate_hz: float
    frames: int
    channels: int
    sha256: str
    capture: Capture
    notes: tuple[Note, ...]
    subtype: str
    integer_bits: int | None


def printable(path: str | bytes | os.PathLike[Any]) -> str:
    """Return a path in printable ASCII, whatever bytes it is made of; line ends and bytes beyond become escapes."""
    return ascii(os.fsdecode(path))[1:-1]


def open_sound(
    path: str | os.PathLike[str],
    *,
    start_s: float = 0.0,
    seconds: float | None = None,
    most_seconds: float = 60.0,
) -> SoundFileContent:
    """Read a stretch of a sound file: from start_s on, `seconds` long or to the end, most_seconds at most.

    Raises:
        WrongUseError: there is no such file, or it can't be read as asked; one line that names the file and the way
            out.
    """
    name = printable(path)
    with opened(path) as file:
        size = os.fstat(file.fileno()).st_size
        if size == 0:
            raise WrongUseError(f"{name}: the file is empty; record it again")
        if size > LARGEST_BYTES:
            raise WrongUseError(f"{name}: {size / 2**30:.1f} GiB is too long to read; cut out a part below 2 GiB")
        container = _examined(file, size, name)
        asked_s = most_seconds if seconds is None else min(seconds, most_seconds)
        decoded = decode(file, name, container.kind, start_s, asked_s, MOST_SAMPLES)
        _require_sound(decoded, name)
        notes = _notes(file, size, name, container, decoded)
        if _shortened(decoded, start_s, seconds):
            notes.append(note(Kind.SHORTENED, seconds=decoded.samples.shape[0] / decoded.rate_hz))
        digest = _sha256(file)
    capture = Capture(decoded.samples, decoded.rate_hz, decoded.first_frame, (), _overloads(decoded))
    return SoundFileContent(
        path=os.fspath(path),
        rate_hz=decoded.rate_hz,
        frames=decoded.frames,
        channels=decoded.samples.shape[1],
        sha256=digest,
        capture=capture,
        notes=tuple(notes),
        subtype=decoded.subtype,
        integer_bits=decoded.integer_bits,
    )


def opened(path: str | os.PathLike[str]) -> BinaryIO:
    """Open a regular file, and nothing that could wait for ever.

    Raises:
        WrongUseError: there is none, or it may not be read.
    """
    name = printable(path)
    try:
        kind = os.stat(path).st_mode  # noqa: PTH116 - Path() refuses what stat does not
        if stat.S_ISDIR(kind):
            raise WrongUseError(f"{name}: this is a folder; name the sound files in it")
        if not stat.S_ISREG(kind):
            raise WrongUseError(f"{name}: this is no regular file but a pipe or device; save the sound to a file first")
        handle = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0))
        file = os.fdopen(handle, "rb")
    except FileNotFoundError:
        raise WrongUseError(f"{name}: there is no such file; check its name") from None
    except PermissionError:
        raise WrongUseError(f"{name}: no permission to read it; change its permissions or copy it") from None
    except (OSError, ValueError) as error:  # ValueError: a null byte in the name
        reason = ascii(getattr(error, "strerror", None) or str(error))[1:-1]
        raise WrongUseError(f"{name}: it cannot be opened ({reason}); check its name and place") from None
    if not stat.S_ISREG(os.fstat(file.fileno()).st_mode):
        file.close()
        raise WrongUseError(f"{name}: this is no regular file but a pipe or device; save the sound to a file first")
    return file


def _examined(file: BinaryIO, size: int, name: str) -> Container:
    try:
        container = examine(file, size)
    except OSError as error:
        raise WrongUseError(f"{name}: it cannot be read ({ascii(error.strerror)[1:-1]}); copy it anew") from None
    if container.promised_bytes - container.there_bytes >= LIE_BYTES:
        raise WrongUseError(
            f"{name}: its header promises {container.promised_bytes} bytes of samples where {container.there_bytes}"
            " follow; export it again"
        )
    return container


def _require_sound(decoded: Decoded, name: str) -> None:
    """Refuse samples that are no numbers or beyond anything that a sound file holds."""
    samples = decoded.samples
    if samples.size == 0 and decoded.broke_at is not None:
        raise WrongUseError(f"{name}: its samples cannot be decoded there; copy or record it again")
    if samples.size == 0:
        raise WrongUseError(f"{name}: it holds no samples there; record it again or start earlier")
    high, low = float(samples.max()), float(samples.min())  # either is NaN where a sample is
    if not (np.isfinite(high) and np.isfinite(low)):
        raise WrongUseError(f"{name}: some of its samples are infinite or no numbers; export it again")
    largest = max(high, -low)
    if largest > LARGEST_SAMPLE:
        raise WrongUseError(f"{name}: its samples reach {largest:.3g} times full scale; scale and export it again")


def _notes(file: BinaryIO, size: int, name: str, container: Container, decoded: Decoded) -> list[Note]:
    """Return what the file's structure, name and decoding say against it."""
    notes = []
    suffix = Path(name).suffix.lower()
    if suffix and suffix not in NAMES.get(decoded.format, {"." + decoded.format.lower()}):
        notes.append(note(Kind.NOT_AS_NAMED, named=suffix, found=decoded.format))
    faults = list(container.faults) or list(decoded.faults)
    promised = max(container.promised_frames or 0, decoded.promised_frames)
    whole_but_broken = decoded.broke_at is not None and _end_is_there(file, size, container)
    if whole_but_broken:
        faults.append(f"its samples cannot be decoded beyond frame {decoded.broke_at} of {promised}")
    if _checksum_differs(file, container, decoded):
        faults.append("its samples are not those that were encoded (their checksum differs)")
    if promised > decoded.frames and not whole_but_broken:
        notes.append(note(Kind.CUT_SHORT, promised_frames=promised, frames=decoded.frames))
    if faults:
        notes.append(note(Kind.DAMAGED, what=faults[0]))
    return notes


def _end_is_there(file: BinaryIO, size: int, container: Container) -> bool:
    """Tell whether a file that broke while decoding still has its end, so that it is damaged and not cut short."""
    info = flac.stream_info(file) if container.kind == "FLAC" else None
    return info is None or flac.end_is_there(file, size, info)


def _checksum_differs(file: BinaryIO, container: Container, decoded: Decoded) -> bool:
    """Tell whether a wholly decoded FLAC stream is another than its header's MD5 says."""
    info = flac.stream_info(file) if container.kind == "FLAC" else None
    return info is not None and info.md5 != b"" and decoded.md5 not in {b"", info.md5}


def _shortened(decoded: Decoded, start_s: float, seconds: float | None) -> bool:
    """Tell whether fewer frames were read than were there and asked for."""
    if decoded.broke_at is not None:
        return False
    wanted = decoded.frames - decoded.first_frame
    if seconds is not None:
        wanted = min(wanted, round((start_s + seconds) * decoded.rate_hz) - decoded.first_frame)
    return bool(decoded.samples.shape[0] < wanted)


def _overloads(decoded: Decoded) -> tuple[Overload, ...]:
    """Return the runs at the format's rails; whether they are an overload is for who knows the tone to say."""
    rails = _rails(decoded)
    if rails is None:
        return ()
    return rail_runs(decoded.samples, *rails, first_frame=decoded.first_frame)


def _rails(decoded: Decoded) -> tuple[float, float] | None:
    if decoded.integer_bits is not None:
        return integer_rails(decoded.integer_bits)
    if _peak(decoded.samples) > 1.0:
        return None  # float samples that exceed full scale stood at no rail
    return -1.0 + 2.0**-23, 1.0 - 2.0**-23  # a 24-bit rail that was scaled to float


def _peak(samples: Samples) -> float:
    return max(float(samples.max()), -float(samples.min()))


def _sha256(file: BinaryIO) -> str:
    file.seek(0)
    digest = hashlib.sha256()
    while block := file.read(1 << 20):
        digest.update(block)
    return digest.hexdigest()
