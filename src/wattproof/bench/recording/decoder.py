"""Decodes a stretch of a sound file block by block, keeping what came before a decoder fails."""

import contextlib
import os
import re
import sys
from collections.abc import Iterator
from threading import Lock
from typing import Any, BinaryIO

import attrs
import numpy as np

from wattproof.bench.recording.flac import SampleHash
from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Samples

BLOCK_SAMPLES = 1 << 18
FLAC_BLOCK_FRAMES = 4096  # where one fails to decode no more than this is lost before it
MOST_FRAMES = 1 << 62  # libsndfile says so where a header does not tell the length
LOWEST_HZ, HIGHEST_HZ = 1_000, 10_000_000
INTEGER_BITS = {"PCM_S8": 8, "PCM_U8": 8, "PCM_16": 16, "PCM_24": 24, "PCM_32": 32}
INTEGER_BITS |= {f"ALAC_{bits}": bits for bits in (16, 20, 24, 32)}
EXAMINED = {"WAV", "AIFF", "W64", "FLAC", "OGG"}  # by this package; their decoders write nothing to stderr
_quieting = Lock()


class Source:
    """A file as the decoding library reads it: no error may cross into it, so what fails is an end of file."""

    def __init__(self, file: BinaryIO) -> None:
        self._file = file

    def seek(self, offset: int, whence: int = os.SEEK_SET) -> int:
        """Go to a byte, or stay where there is none."""
        with contextlib.suppress(OSError, ValueError, OverflowError):
            self._file.seek(offset, whence)
        return self._file.tell()

    def tell(self) -> int:
        """Return the byte that is read next."""
        return self._file.tell()

    def read(self, count: int) -> bytes:
        """Return up to count bytes."""
        try:
            return self._file.read(count)
        except OSError:
            return b""


@attrs.frozen(eq=False)
class Decoded:
    """What a decoder gave. `frames` are those there are, `promised_frames` those that it says there were."""

    samples: Samples
    rate_hz: float
    first_frame: int
    frames: int
    promised_frames: int
    format: str
    subtype: str
    integer_bits: int | None
    broke_at: int | None = None  # the frame at which the decoder failed
    md5: bytes = b""  # of the samples, where all of a FLAC file was decoded
    faults: tuple[str, ...] = ()


def decode(file: BinaryIO, name: str, kind: str, start_s: float, seconds: float, most_samples: int) -> Decoded:  # noqa: PLR0913, PLR0917 - a file, and which part of it
    """Decode from start_s on, `seconds` at most and most_samples over all channels at most.

    Raises:
        WrongUseError: it is no sound file that can be read, or start_s lies beyond its end.
    """
    import soundfile  # noqa: PLC0415 - 0.1 s that a simulated bench need not pay

    file.seek(0)
    with contextlib.nullcontext() if kind in EXAMINED else _quiet():
        try:
            with soundfile.SoundFile(Source(file)) as sound:
                return _decoded(sound, name, kind, start_s, seconds, most_samples)
        except (soundfile.SoundFileError, TypeError) as error:  # TypeError: a name that promises headerless samples
            reason = ascii(getattr(error, "error_string", "") or "not understood")[1:-1].strip(" .")
            raise WrongUseError(f"{name}: it is no readable sound file ({reason}); export it as WAV or FLAC") from None
        except (OSError, MemoryError, ValueError, OverflowError) as error:
            reason = ascii(str(error))[1:-1]
            raise WrongUseError(f"{name}: it cannot be read ({reason}); export it as WAV or FLAC") from None


def _decoded(sound: Any, name: str, kind: str, start_s: float, seconds: float, most_samples: int) -> Decoded:  # noqa: ANN401, PLR0913, PLR0917 - as above
    rate_hz, channels, promised = int(sound.samplerate), int(sound.channels), int(sound.frames)
    if not LOWEST_HZ <= rate_hz <= HIGHEST_HZ:
        raise WrongUseError(f"{name}: its rate is {rate_hz} Hz; it must lie from {LOWEST_HZ} to {HIGHEST_HZ} Hz")
    if promised <= 0:
        raise WrongUseError(f"{name}: it holds no samples; record it again")
    first = round(start_s * rate_hz)
    if first >= promised:
        raise WrongUseError(f"{name}: the start of {start_s:g} s lies beyond its end at {promised / rate_hz:g} s")
    if first:
        sound.seek(first)
    wanted = min(promised - first, round(seconds * rate_hz), most_samples // channels)
    whole = first == 0 and wanted == promised
    bits = int(sound.subtype.removeprefix("PCM_").removeprefix("S")) if sound.format == "FLAC" else None
    digest = SampleHash(bits) if bits and whole else None
    samples, broke = _read(sound, wanted, digest)
    got = samples.shape[0]
    ended = got < wanted
    frames = first + got if ended or promised >= MOST_FRAMES else promised
    return Decoded(
        samples=samples,
        rate_hz=float(rate_hz),
        first_frame=first,
        frames=frames,
        promised_frames=promised if promised < MOST_FRAMES else 0,
        format=str(sound.format),
        subtype=str(sound.subtype),
        integer_bits=INTEGER_BITS.get(sound.subtype),
        broke_at=first + got if broke else None,
        md5=digest.digest() if digest and not ended else b"",
        faults=() if kind in EXAMINED else _log_faults(str(sound.extra_info), promised),
    )


def _read(sound: Any, wanted: int, digest: SampleHash | None) -> tuple[Samples, bool]:  # noqa: ANN401
    """Return up to `wanted` frames, and whether the decoder failed before."""
    import soundfile  # noqa: PLC0415 - as above

    samples = np.empty((wanted, sound.channels))
    block = FLAC_BLOCK_FRAMES if sound.format == "FLAC" else max(BLOCK_SAMPLES // sound.channels, 1)
    done = 0
    while done < wanted:
        count = min(block, wanted - done)
        try:
            if digest is None:
                part = sound.read(count, dtype="float64", always_2d=True)
            else:
                raw = sound.read(count, dtype="int32", always_2d=True)
                digest.add(raw)
                part = raw * 2.0**-31
        except soundfile.SoundFileError:
            return samples[:done], True
        samples[done : done + part.shape[0]] = part
        done += part.shape[0]
        if part.shape[0] < count:
            break
    return samples[:done], False


def _log_faults(log: str, frames: int) -> tuple[str, ...]:
    """Return what libsndfile's own log of the header says against a file of a kind that is not examined here."""
    stated = re.search(r"^\s*Frames\s*:\s*(\d+)\s*$", log, re.MULTILINE)
    if stated and int(stated[1]) > frames:
        return (f"its header says {stated[1]} frames, {frames} are there",)
    length = re.search(r"^Length\s*:\s*(\d+)\s*$", log, re.MULTILINE)
    sizes = [int(size) for size in re.findall(r"\bSize\s*:\s*(\d+)", log)]
    if length and max(sizes, default=0) > int(length[1]):
        return (f"its header says {max(sizes)} bytes, the file has {length[1]}",)
    if re.search(r"should be|\*\*\*|truncated", log):
        return ("its header and its length contradict each other",)
    return ()


@contextlib.contextmanager
def _quiet() -> Iterator[None]:
    """Keep a decoding library from writing to the process's standard error; its complaints come as errors anyway."""
    with _quieting:
        sys.stderr.flush()
        kept, nowhere = os.dup(2), os.open(os.devnull, os.O_WRONLY)
        try:
            os.dup2(nowhere, 2)
            yield
        finally:
            os.dup2(kept, 2)
            os.close(kept)
            os.close(nowhere)
