"""Containers made of chunks: WAVE (RIFF, RIFX, RF64), AIFF and W64; their sizes are checked against the file.

Sources: Microsoft/IBM, Multimedia Programming Interface and Data Specifications 1.0 (RIFF); EBU Tech 3306 (RF64);
Apple, Audio Interchange File Format 1.3.
"""

import struct
from collections.abc import Iterator
from typing import BinaryIO

import attrs

from wattproof.bench.recording.container import Container

W64_START = b"riff\x2e\x91\xcf\x11\xa5\xd6\x28\xdb\x04\xc1\x00\x00"
MOST_CHUNKS = 10_000
UNKNOWN_SIZE = 0xFFFFFFFF  # EBU Tech 3306: the true size stands elsewhere; streaming writers leave it too
PCM, IEEE_FLOAT, EXTENSIBLE = 1, 3, 0xFFFE


@attrs.frozen
class _Chunk:
    name: bytes
    start: int  # of its content
    size: int  # of its content, as stated


@attrs.frozen
class _Layout:
    """How a family of containers writes its chunks."""

    head: struct.Struct  # name, size
    own: int  # bytes of the head that the size counts too
    align: int


_LITTLE = _Layout(struct.Struct("<4sI"), 0, 2)
_BIG = _Layout(struct.Struct(">4sI"), 0, 2)
_W64 = _Layout(struct.Struct("<16sQ"), 24, 8)


def _chunks(file: BinaryIO, start: int, end: int, layout: _Layout, sizes: dict[bytes, int]) -> Iterator[_Chunk]:
    """Yield the chunks from start on; `sizes` replaces sizes stated as unknown."""
    for _ in range(MOST_CHUNKS):
        if start >= end:
            return
        file.seek(start)
        head = file.read(layout.head.size)
        if len(head) < layout.head.size:
            return
        name, size = layout.head.unpack(head)
        if size == UNKNOWN_SIZE and layout.own == 0:
            size = sizes.get(name, size)
        size = max(size - layout.own, 0)
        yield _Chunk(name, start + layout.head.size, size)
        start += layout.head.size + size
        start += -start % layout.align


def _size_faults(stated: int, size: int) -> list[str]:
    """Return the fault of a file that is longer than its header states (a shorter one is cut short, said elsewhere)."""
    if size > stated + 1:
        return [f"{size - stated} bytes follow the end that its header states"]
    return []


def _chunk_faults(chunks: list[_Chunk], data: _Chunk | None, size: int) -> list[str]:
    names = [chunk.name for chunk in chunks]
    faults = []
    if any(not all(32 <= byte < 127 for byte in name[:4]) for name in names):
        faults.append("between its chunks stands what is no chunk")
    beyond = [chunk for chunk in chunks if chunk is not data and chunk.start + chunk.size > size]
    if beyond and (data is None or beyond[0].start < data.start or data.start + data.size <= size):
        faults.append("a chunk reaches beyond the end of the file")
    return faults


def _container(kind: str, data: _Chunk | None, frame_bytes: int, size: int, faults: list[str]) -> Container:
    if data is None:
        return Container(kind, faults=(*faults, "it holds no chunk of samples"))
    frames = data.size // frame_bytes if frame_bytes else None
    if frame_bytes and data.size % frame_bytes:
        faults.append("its samples end within a frame")
    return Container(kind, frames, data.size, max(size - data.start, 0), tuple(faults))


def examine_wav(file: BinaryIO, size: int) -> Container:
    """Return what a WAVE file says of itself, in either byte order, with 64-bit sizes or not."""
    file.seek(0)
    form, stated, _ = struct.unpack("<4sI4s", file.read(12))
    sizes: dict[bytes, int] = {}
    if form == b"RF64":
        file.seek(12)
        head = file.read(36)
        if len(head) == 36 and head[:4] == b"ds64":
            stated, sizes[b"data"] = struct.unpack("<QQ", head[8:24])
    layout = _LITTLE
    if form == b"RIFX":
        layout, stated = _BIG, int.from_bytes(struct.pack("<I", stated), "big")
    chunks = list(_chunks(file, 12, min(size, stated + 8), layout, sizes))
    data = next((chunk for chunk in chunks if chunk.name == b"data"), None)
    faults = _size_faults(stated + 8, size) + _chunk_faults(chunks, data, size)
    frame_bytes = 0
    about = next((chunk for chunk in chunks if chunk.name == b"fmt "), None)
    if about is not None:
        file.seek(about.start)
        frame_bytes, more = _format(file.read(min(about.size, 40)), "<" if layout is _LITTLE else ">")
        faults += more
    return _container("WAV", data, frame_bytes, size, faults)


def _format(content: bytes, order: str) -> tuple[int, list[str]]:
    """Return the bytes of a frame of plain samples (0 for coded ones) and the faults of a WAVE format chunk."""
    if len(content) < 16:
        return 0, ["its format chunk is too short"]
    tag, channels, rate_hz, bytes_per_s, frame_bytes, bits = struct.unpack(order + "HHIIHH", content[:16])
    if tag == EXTENSIBLE and len(content) >= 26:
        (tag,) = struct.unpack(order + "H", content[24:26])
    if tag not in {PCM, IEEE_FLOAT}:
        return 0, []
    faults = []
    sample_bytes = frame_bytes // channels if channels else 0
    if sample_bytes * channels != frame_bytes or not -(-bits // 8) <= sample_bytes <= 8 or bits == 0:
        faults.append(f"its header says {channels} channels of {bits} bits in {frame_bytes} bytes a frame")
    if bytes_per_s != rate_hz * frame_bytes:
        faults.append(f"its header says {bytes_per_s} bytes a second, but {rate_hz} Hz and {frame_bytes} bytes a frame")
    return frame_bytes, faults


def examine_aiff(file: BinaryIO, size: int) -> Container:
    """Return what an AIFF or AIFF-C file says of itself."""
    file.seek(0)
    _, stated, _ = struct.unpack(">4sI4s", file.read(12))
    chunks = list(_chunks(file, 12, min(size, stated + 8), _BIG, {}))
    data = next((chunk for chunk in chunks if chunk.name == b"SSND"), None)
    faults = _size_faults(stated + 8, size) + _chunk_faults(chunks, data, size)
    about = next((chunk for chunk in chunks if chunk.name == b"COMM"), None)
    if data is None or about is None:
        return _container("AIFF", data, 0, size, faults)
    file.seek(about.start)
    common = file.read(min(about.size, 22))
    if len(common) < 18:
        return _container("AIFF", data, 0, size, [*faults, "its format chunk is too short"])
    channels, frames, bits = struct.unpack(">hIh", common[:8])
    coded = common[18:22] not in {b"", b"NONE", b"twos", b"sowt"}
    frame_bytes = channels * -(-bits // 8)
    if not coded and frames * frame_bytes != data.size - 8:
        faults.append(f"its header says {frames} frames, its samples take {data.size - 8} bytes")
    return Container("AIFF", frames, data.size, max(size - data.start, 0), tuple(faults))


def examine_w64(file: BinaryIO, size: int) -> Container:
    """Return what a W64 file says of itself: RIFF's chunks with 16-byte names and 8-byte sizes."""
    file.seek(16)
    content = file.read(8)
    stated = int.from_bytes(content, "little") if len(content) == 8 else 0
    chunks = list(_chunks(file, 40, min(size, stated), _W64, {}))
    data = next((chunk for chunk in chunks if chunk.name[:4] == b"data"), None)
    about = next((chunk for chunk in chunks if chunk.name[:4] == b"fmt "), None)
    faults = _size_faults(stated + 7, size) + _chunk_faults(chunks, data, size)  # 7: padding to 8 bytes
    if about is None:
        return _container("W64", data, 0, size, faults)
    file.seek(about.start)
    frame_bytes, more = _format(file.read(min(about.size, 40)), "<")
    return _container("W64", data, frame_bytes, size, faults + more)
