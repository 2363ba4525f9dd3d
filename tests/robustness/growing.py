"""A small file grown to 10 MB, in the ways in which files grow: more rows, longer lines, more of
everything; for what reading costs."""

from __future__ import annotations

import io
import zipfile
from random import Random

from coatgui.intake.workbook import is_workbook

SIZE = 10_000_000
_UNPACKED = 39_000_000  # of a workbook, just within what is unpacked at all


def grown(data: bytes, chance: Random) -> tuple[str, bytes]:
    """How it grew, and the bytes."""
    if is_workbook(data):
        return _workbook(data, chance)
    how, large = _text(data or b";", chance, SIZE)
    return how, large[:SIZE]


def _text(data: bytes, chance: Random, size: int) -> tuple[str, bytes]:
    lines = data.splitlines(keepends=True)
    place = chance.randrange(len(lines))
    stop = min(place + chance.randrange(1, 60), len(lines))
    match chance.randrange(5):
        case 0:
            return "all again", data * (size // len(data) + 1)
        case 1:
            more = lines[place] if lines[place].strip() else b"1;2;3\n"
            return "one line again", _filled(lines[:place], more, lines[place:], size, chance)
        case 2:
            more = b"".join(lines[place:stop])
            return "some lines again", _filled(lines[:place], more, lines[stop:], size, chance)
        case 3:
            # The first rows, and then the rest of the file again and again.
            more = b"".join(lines[place:])
            return "the end again", _filled(lines[:place], more, [], size, chance)
    at = chance.randrange(len(data))
    piece = data[at : at + chance.randrange(1, 40)]
    longer = data[:at] + piece * chance.choice((10, 300, 3000)) + data[at:]
    return "longer cells, all again", longer * (size // len(longer) + 1)


def _filled(
    before: list[bytes], more: bytes, after: list[bytes], size: int, chance: Random
) -> bytes:
    start, end = b"".join(before), b"".join(after)
    count = max(0, size - len(start) - len(end)) // len(more) + 1
    if chance.random() < 0.3:
        return start + more * count  # nothing behind it
    return start + more * count + end


def _workbook(data: bytes, chance: Random) -> tuple[str, bytes]:
    held = io.BytesIO()
    how = "not grown"
    try:
        with (
            zipfile.ZipFile(io.BytesIO(data)) as source,
            zipfile.ZipFile(held, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as target,
        ):
            infos = source.infolist()
            names = [i.filename for i in infos if "sheet1" in i.filename or chance.random() < 0.15]
            chosen = chance.choice(names or [infos[0].filename])
            for info in infos:
                content = source.read(info)
                if info.filename == chosen and content:
                    how, content = _part(content, chance)
                target.writestr(info.filename, content)
    except Exception:  # broken as an archive: only its bytes can grow
        how, large = _text(data, chance, SIZE)
        return how, large[:SIZE]
    return f"{how} in {chosen}", held.getvalue()


def _part(content: bytes, chance: Random) -> tuple[str, bytes]:
    """A part of a workbook with one of its elements repeated."""
    starts = [i for i in range(len(content)) if content[i : i + 1] == b"<"]
    if len(starts) < 2:
        return "all again", content * (_UNPACKED // len(content))
    first = chance.randrange(len(starts) - 1)
    last = min(first + chance.choice((1, 2, 4, 8, 30, 200)), len(starts) - 1)
    more = content[starts[first] : starts[last]]
    count = chance.choice((1, 4)) * (_UNPACKED // 4) // len(more)
    return "elements again", content[: starts[first]] + more * count + content[starts[first] :]
