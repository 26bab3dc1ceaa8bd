"""The structure of a FLAC stream as far as it tells damage: STREAMINFO, the first and the last frame header, the MD5.

Source: RFC 9639 (2024), sections 8.2 (STREAMINFO) and 9.1 (frame header).
"""

import hashlib
import struct
from typing import BinaryIO

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.bench.recording.container import Container

MOST_BLOCKS = 1000
TAIL_BYTES = 1 << 18  # holds the last frame's header: libraries write frames well below that size
# RFC 9639, tables 15 and 18: values by code; 0 stands for "as in STREAMINFO" or "written behind the header"
RATES_HZ = (0, 88_200, 176_400, 192_000, 8_000, 16_000, 22_050, 24_000, 32_000, 44_100, 48_000, 96_000)
BITS = (0, 8, 12, 0, 16, 20, 24, 32)


@attrs.frozen
class StreamInfo:
    """What STREAMINFO says; `md5` is empty where the writer left it out, and so is `frames` 0."""

    block_frames: int
    rate_hz: int
    channels: int
    bits: int
    frames: int
    md5: bytes
    first_frame_at: int  # the byte at which the first frame begins


@attrs.frozen
class FrameHeader:
    """One frame header: `start` counts in frames of samples."""

    start: int
    frames: int
    rate_hz: int
    channels: int
    bits: int


def stream_info(file: BinaryIO) -> StreamInfo | None:
    """Return a stream's STREAMINFO, or None where it is broken."""
    file.seek(4)
    info = b""
    for _ in range(MOST_BLOCKS):
        head = file.read(4)
        if len(head) < 4:
            return None
        size = int.from_bytes(head[1:], "big")
        if head[0] & 0x7F == 0 and size == 34:
            info = file.read(34)
        else:
            file.seek(size, 1)
        if head[0] & 0x80:
            break
    if len(info) < 34:
        return None
    packed = int.from_bytes(info[10:18], "big")
    md5 = info[18:34]
    return StreamInfo(
        block_frames=struct.unpack(">H", info[:2])[0],
        rate_hz=packed >> 44,
        channels=(packed >> 41 & 7) + 1,
        bits=(packed >> 36 & 31) + 1,
        frames=packed & (1 << 36) - 1,
        md5=md5 if any(md5) else b"",
        first_frame_at=file.tell(),
    )


def examine(file: BinaryIO, size: int) -> Container:
    """Return what a FLAC file says of itself, and whether its first frame agrees."""
    info = stream_info(file)
    if info is None:
        return Container("FLAC", faults=("its header is broken",))
    file.seek(info.first_frame_at)
    first = frame_header(file.read(16), info)
    faults = []
    if first is None:
        if size > info.first_frame_at:
            faults.append("what follows its header is no frame")
    elif (first.rate_hz, first.channels, first.bits) != (info.rate_hz, info.channels, info.bits):
        faults.append(
            f"its header says {info.channels} channels of {info.bits} bits at {info.rate_hz} Hz, its first frame"
            f" {first.channels} of {first.bits} at {first.rate_hz} Hz"
        )
    return Container("FLAC", info.frames or None, faults=tuple(faults))


def end_is_there(file: BinaryIO, size: int, info: StreamInfo) -> bool:
    """Tell whether the stream's last frame begins within the file, so that what fails to decode was not cut off."""
    file.seek(max(size - TAIL_BYTES, info.first_frame_at))
    tail = file.read(TAIL_BYTES)
    at = len(tail)
    while (at := tail.rfind(b"\xff", 0, at)) >= 0:
        header = frame_header(tail[at : at + 16], info)
        if header is not None and header.start < info.frames <= header.start + header.frames:
            return True
    return False


def frame_header(content: bytes, info: StreamInfo) -> FrameHeader | None:
    """Return the frame header at the start of content, or None where none stands there whole and with its CRC."""
    if len(content) < 6 or content[0] != 0xFF or content[1] & 0xFE != 0xF8 or content[3] & 1:
        return None
    block_code, rate_code = content[2] >> 4, content[2] & 15
    channel_code, bits_code = content[3] >> 4, content[3] >> 1 & 7
    number, at = _coded_number(content)
    if at == 0 or block_code == 0 or rate_code == 15 or channel_code > 10 or bits_code == 3:
        return None
    frames, at = _block_frames(content, at, block_code)
    rate_hz, at = _rate_hz(content, at, rate_code, info)
    if at >= len(content) or crc8(content[:at]) != content[at]:
        return None
    start = number if content[1] & 1 else number * info.block_frames
    channels = channel_code + 1 if channel_code < 8 else 2
    return FrameHeader(start, frames, rate_hz, channels, BITS[bits_code] or info.bits)


def _coded_number(content: bytes) -> tuple[int, int]:
    """Return the number coded as UTF-8 codes a character, and where it ends (0: it is none)."""
    lead = content[4]
    if lead < 0x80:
        return lead, 5
    length = next((count for count in range(2, 8) if not lead & 0x80 >> count), 8)
    if lead & 0xC0 == 0x80 or length > 7 or len(content) < 4 + length:
        return 0, 0
    number = lead & (0x7F >> length)
    for byte in content[5 : 4 + length]:
        if byte & 0xC0 != 0x80:
            return 0, 0
        number = number << 6 | byte & 0x3F
    return number, 4 + length


def _block_frames(content: bytes, at: int, code: int) -> tuple[int, int]:
    if code == 1:
        return 192, at
    if code < 6:
        return 144 << code, at
    if code < 8:
        length = code - 5
        return int.from_bytes(content[at : at + length], "big") + 1, at + length
    return 1 << code, at


def _rate_hz(content: bytes, at: int, code: int, info: StreamInfo) -> tuple[int, int]:
    if code < 12:
        return RATES_HZ[code] or info.rate_hz, at
    length = 1 if code == 12 else 2
    return int.from_bytes(content[at : at + length], "big") * (1000, 1, 10)[code - 12], at + length


def crc8(content: bytes) -> int:
    """Return the CRC-8 of a frame header (polynomial x⁸ + x² + x + 1, starting at 0)."""
    crc = 0
    for byte in content:
        crc ^= byte
        for _ in range(8):
            crc = (crc << 1 ^ 0x07) & 0xFF if crc & 0x80 else crc << 1
    return crc


class SampleHash:
    """The MD5 of the decoded samples as STREAMINFO wants it: signed, little-endian, whole bytes, interleaved."""

    def __init__(self, bits: int) -> None:
        self._bits, self._bytes = bits, -(-bits // 8)
        self._md5 = hashlib.md5(usedforsecurity=False)

    def add(self, block: NDArray[np.int32]) -> None:
        """Add frames as decoded: shape (frames, channels), the sample in the upper bits."""
        samples = (block >> (32 - self._bits)).astype("<i4")
        octets = np.ascontiguousarray(samples).view(np.uint8).reshape(-1, 4)[:, : self._bytes]
        self._md5.update(np.ascontiguousarray(octets).tobytes())

    def digest(self) -> bytes:
        """Return the MD5 so far."""
        return self._md5.digest()
