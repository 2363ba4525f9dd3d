"""From bytes to lines of text: the encoding, and the limits a text file must keep."""

from __future__ import annotations

import codecs
import io
from collections.abc import Iterator

from coatgui.intake.errors import Unreadable

LARGEST_FILE = 200_000_000
LONGEST_LINE = 100_000
_CHUNK = 1 << 20
_CHARACTERS = 1 << 17
_NOT_TEXT = "The file is not text: export the table as text."
_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)


def encoding_of(data: bytes) -> str:
    """The encoding of a text file. Raises Unreadable for what is no text."""
    if len(data) > LARGEST_FILE:
        raise Unreadable("The file is larger than 200 MB: split it.")
    for mark, name in _MARKS:
        if data.startswith(mark):
            breaks = _breaks_at(data, name)
            if breaks is not None:
                raise Unreadable(f"The file says it is {name} but breaks at byte {breaks}.")
            return name
    head = data[:4096]
    if b"\x00" in head:
        # In UTF-16, every other byte of plain letters and digits is zero.
        odd, even = head[1::2].count(0), head[0::2].count(0)
        if max(odd, even) < 0.5 * len(head[0::2]) or min(odd, even) > 0.1 * len(head[0::2]):
            raise Unreadable(_NOT_TEXT)
        name = "utf-16-le" if odd >= even else "utf-16-be"
        if _breaks_at(data, name) is not None:
            raise Unreadable(_NOT_TEXT)
        return name
    if any(byte < 9 or 13 < byte < 26 for byte in head):
        raise Unreadable(_NOT_TEXT)
    if data.isascii() or _breaks_at(data, "utf-8") is None:
        return "utf-8"
    return "cp1252" if _breaks_at(data, "cp1252") is None else "latin-1"


def _breaks_at(data: bytes, encoding: str) -> int | None:
    """Where the bytes are not of this encoding (to a chunk), without keeping the text."""
    decoder = codecs.getincrementaldecoder(encoding)()
    view = memoryview(data)
    for start in range(0, len(data) or 1, _CHUNK):
        try:
            decoder.decode(view[start : start + _CHUNK], final=start + _CHUNK >= len(data))
        except UnicodeDecodeError as error:
            return start + error.start
    return None


def lines_of(data: bytes, encoding: str) -> Iterator[str]:
    """The lines, without their ends, one at a time. Raises Unreadable where one is endless."""
    # The bytes are shared, not copied; text is made as it is asked for.
    text = io.TextIOWrapper(io.BytesIO(data), encoding=encoding, errors="replace", newline=None)
    number = 0
    rest = ""
    while chunk := text.read(_CHARACTERS):
        lines = (rest + chunk).split("\n")
        rest = lines.pop()
        if len(rest) >= LONGEST_LINE or (lines and max(map(len, lines)) >= LONGEST_LINE):
            long = next(i for i, line in enumerate([*lines, rest], 1) if len(line) >= LONGEST_LINE)
            raise Unreadable(
                f"Line {number + long} is longer than {LONGEST_LINE} characters: no table."
            )
        number += len(lines)
        yield from lines
    if rest:
        yield rest


def decode(data: bytes) -> tuple[str, str]:
    """Text and encoding of a list. Raises Unreadable for what is no text."""
    encoding = encoding_of(data)
    return data.decode(encoding, errors="replace"), encoding
