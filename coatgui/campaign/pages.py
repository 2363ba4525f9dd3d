"""Rows out of a damaged database, page by page, without SQLite and without trust.

The file format is that of https://www.sqlite.org/fileformat2.html. Every page that looks like a
leaf of a table is read cell by cell; what does not fit is passed over. Pages on the list of free
pages are left aside, as they may hold rows that were removed.
"""

from __future__ import annotations

import struct
from collections.abc import Iterator
from dataclasses import dataclass, field

Value = str | int | float | bytes | None

_LEAF_OF_TABLE, _KINDS = 0x0D, {0x02, 0x05, 0x0A, 0x0D}
_PAGE_BYTES = 4096  # what our files have, where the header cannot say
_MOST_COLUMNS = 100
_MOST_BYTES = 500_000_000


class _Nonsense(Exception):
    """Bytes that are no cell."""


@dataclass
class Pages:
    """`unreadable` counts pages, and cells on good pages, that hold what cannot be read."""

    content: memoryview
    unreadable: int = 0
    _used: set[int] = field(default_factory=set)

    def __post_init__(self) -> None:
        said = int.from_bytes(self.content[16:18])
        said = 65536 if said == 1 else said
        is_size = 512 <= said <= 65536 and said & (said - 1) == 0
        self._size = said if is_size else _PAGE_BYTES
        reserved = self.content[20] if len(self.content) > 20 else 0
        self._usable = self._size - (reserved if self._size - reserved >= 480 else 0)
        self._count = -(-len(self.content) // self._size)

    def rows(self) -> Iterator[tuple[int, tuple[Value, ...]]]:
        """Row ids and values of all rows that can be read, in the order of their pages."""
        free = self._free_pages()
        kinds = {}
        for number in range(1, self._count + 1):
            if number in free:
                continue
            page = self._page(number)
            start = 100 if number == 1 else 0
            kinds[number] = page[start] if len(page) > start + 8 else 0
            if kinds[number] == _LEAF_OF_TABLE:
                yield from self._leaf(page, start)
        # What is neither a page of a tree nor carries on a long row holds something lost.
        self.unreadable += sum(
            kind not in _KINDS and number not in self._used for number, kind in kinds.items()
        )

    def _page(self, number: int) -> memoryview:
        return self.content[(number - 1) * self._size : number * self._size]

    def _free_pages(self) -> set[int]:
        free: set[int] = set()
        trunk = int.from_bytes(self.content[32:36])
        while 1 < trunk <= self._count and trunk not in free:
            free.add(trunk)
            page = self._page(trunk)
            leaves = int.from_bytes(page[4:8])
            if leaves > self._usable // 4 - 2:
                break
            for k in range(leaves):
                free.add(int.from_bytes(page[8 + 4 * k : 12 + 4 * k]))
            trunk = int.from_bytes(page[0:4])
        return free

    def _leaf(self, page: memoryview, start: int) -> Iterator[tuple[int, tuple[Value, ...]]]:
        cells = int.from_bytes(page[start + 3 : start + 5])
        if cells > (self._usable - 8) // 4:
            self.unreadable += 1
            return
        for k in range(cells):
            pointer = start + 8 + 2 * k
            place = int.from_bytes(page[pointer : pointer + 2])
            try:
                yield self._cell(page, place)
            except (_Nonsense, IndexError, ValueError, OverflowError):
                self.unreadable += 1

    def _cell(self, page: memoryview, place: int) -> tuple[int, tuple[Value, ...]]:
        size, place = _varint(page, place)
        row_id, place = _varint(page, place)
        if size > min(len(self.content), _MOST_BYTES):
            raise _Nonsense
        return row_id, _record(self._payload(page, place, size))

    def _payload(self, page: memoryview, place: int, size: int) -> bytes:
        usable = self._usable
        if size <= usable - 35:
            local = size
        else:
            least = (usable - 12) * 32 // 255 - 23
            local = least + (size - least) % (usable - 4)
            if local > usable - 35:
                local = least
        pieces = [bytes(page[place : place + local])]
        if len(pieces[0]) < local:
            raise _Nonsense
        left = size - local
        following = int.from_bytes(page[place + local : place + local + 4]) if left else 0
        seen: set[int] = set()
        while left > 0:
            if not 1 < following <= self._count or following in seen:
                raise _Nonsense
            seen.add(following)
            page = self._page(following)
            piece = bytes(page[4 : 4 + min(left, usable - 4)])
            if not piece:
                raise _Nonsense
            pieces.append(piece)
            left -= len(piece)
            following = int.from_bytes(page[0:4])
        self._used |= seen
        return b"".join(pieces)


def _varint(data: memoryview | bytes, place: int) -> tuple[int, int]:
    value = 0
    for k in range(9):
        byte = data[place + k]
        if k == 8:
            return value << 8 | byte, place + 9
        value = value << 7 | byte & 0x7F
        if byte < 0x80:
            return value, place + k + 1
    raise _Nonsense


def _record(payload: bytes) -> tuple[Value, ...]:
    header_size, place = _varint(payload, 0)
    if header_size > len(payload):
        raise _Nonsense
    kinds = []
    while place < header_size:
        kind, place = _varint(payload, place)
        kinds.append(kind)
        if len(kinds) > _MOST_COLUMNS:
            raise _Nonsense
    values: list[Value] = []
    place = header_size
    for kind in kinds:
        value, place = _value(payload, place, kind)
        values.append(value)
    return tuple(values)


_WIDTHS = {1: 1, 2: 2, 3: 3, 4: 4, 5: 6, 6: 8, 7: 8}


def _value(payload: bytes, place: int, kind: int) -> tuple[Value, int]:
    if kind in (0, 8, 9):
        return (None, 0, 1)[(0, 8, 9).index(kind)], place
    width = _WIDTHS[kind] if kind in _WIDTHS else (kind - 12) // 2
    piece = payload[place : place + width]
    if kind in (10, 11) or len(piece) < width:
        raise _Nonsense
    place += width
    if kind == 7:
        return struct.unpack(">d", piece)[0], place
    if kind < 7:
        return int.from_bytes(piece, signed=True), place
    return (piece.decode("utf-8") if kind % 2 else piece), place
