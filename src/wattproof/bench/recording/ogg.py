"""The pages of an Ogg file: each carries a checksum, a number and, at the end, a mark that nothing follows.

Source: RFC 3533 (2003), section 6.
"""

import zlib
from typing import BinaryIO

from wattproof.bench.recording.container import Container

HEAD_BYTES = 27
MOST_PAGES = 200_000  # a second's work; some 900 MB of pages as they are commonly written
END_OF_STREAM = 4
# The checksum takes each byte from its upper bit on; zlib's takes it from its lower: so bits are turned around twice.
_TURNED = bytes(int(f"{byte:08b}"[::-1], 2) for byte in range(256))


def checksum(page: bytes) -> int:
    """Return the CRC-32 of a page whose own checksum is zeroed: polynomial 0x04c11db7, starting at 0, not inverted."""
    turned = zlib.crc32(page.translate(_TURNED), 0xFFFFFFFF) ^ 0xFFFFFFFF
    return int(f"{turned:032b}"[::-1], 2)


def examine(file: BinaryIO, size: int) -> Container:
    """Return the faults of an Ogg file's pages; its length is left to the decoder."""
    at, flags = 0, 0
    numbers: dict[bytes, int] = {}
    for _ in range(MOST_PAGES):
        if at >= size:
            break
        page = _page(file, at)
        if page is None:
            return Container("OGG", faults=(f"its pages end at byte {at} of {size}",))
        if checksum(page[:22] + bytes(4) + page[26:]) != int.from_bytes(page[22:26], "little"):
            return Container("OGG", faults=(f"the page at byte {at} is not as it was written",))
        stream, number = page[14:18], int.from_bytes(page[18:22], "little")
        if number != numbers.get(stream, -1) + 1:
            return Container("OGG", faults=(f"a page is missing before byte {at}",))
        numbers[stream] = number
        flags = page[5]
        at += len(page)
    unread = at < size
    return Container("OGG", faults=() if unread or flags & END_OF_STREAM else ("its last page is missing",))


def _page(file: BinaryIO, at: int) -> bytes | None:
    """Return the page at a byte, or None where none stands there whole."""
    file.seek(at)
    head = file.read(HEAD_BYTES)
    if len(head) < HEAD_BYTES or head[:4] != b"OggS":
        return None
    sizes = file.read(head[26])
    body = file.read(sum(sizes))
    if len(sizes) < head[26] or len(body) < sum(sizes):
        return None
    return head + sizes + body
