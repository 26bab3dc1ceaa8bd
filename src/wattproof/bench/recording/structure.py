"""Looks at a sound file's first bytes and has its structure examined by who knows that kind."""

from collections.abc import Callable
from typing import BinaryIO

from wattproof.bench.recording import flac, ogg, riff
from wattproof.bench.recording.container import Container


def examine(file: BinaryIO, size: int) -> Container:
    """Return what the structure of a file of `size` bytes says of it; nothing is raised for any content."""
    file.seek(0)
    start = file.read(16)
    readers: tuple[tuple[bool, Callable[[BinaryIO, int], Container]], ...] = (
        (start[:4] in {b"RIFF", b"RIFX", b"RF64"} and start[8:12] == b"WAVE", riff.examine_wav),
        (start[:4] == b"FORM" and start[8:12] in {b"AIFF", b"AIFC"}, riff.examine_aiff),
        (start == riff.W64_START, riff.examine_w64),
        (start[:4] == b"fLaC", flac.examine),
        (start[:4] == b"OggS", ogg.examine),
        (start[:3] == b"ID3" or (start[:1] == b"\xff" and start[1:2] >= b"\xe0"), _mpeg),
    )
    reader = next((reader for fits, reader in readers if fits), None)
    return reader(file, size) if reader else Container()


def _mpeg(file: BinaryIO, size: int) -> Container:  # noqa: ARG001 - one signature for all
    """Return the kind alone: an MPEG stream has no length of its own; the decoder counts."""
    return Container("MP3")
