"""A picture for tests."""

from __future__ import annotations

import zlib


def png(width: int = 1, height: int = 1) -> bytes:
    """A grey picture."""
    lines = (b"\x00" + b"\x80" * width) * height
    header = width.to_bytes(4) + height.to_bytes(4) + bytes((8, 0, 0, 0, 0))
    chunks = ((b"IHDR", header), (b"IDAT", zlib.compress(lines)), (b"IEND", b""))
    told = b"".join(
        len(content).to_bytes(4) + kind + content + zlib.crc32(kind + content).to_bytes(4)
        for kind, content in chunks
    )
    return b"\x89PNG\r\n\x1a\n" + told
