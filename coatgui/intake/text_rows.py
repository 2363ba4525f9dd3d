"""From the lines of a text file to rows: whole stretches of a table at once, anything else line by
line; cells in quotation marks that go on over a line's end are put together."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Sequence
from itertools import islice

from coatgui.intake.complex_cells import opener
from coatgui.intake.cut import BLANKS, Cut
from coatgui.intake.errors import Unreadable
from coatgui.intake.numbers import line_pattern
from coatgui.intake.segments import MOST_ODD_ROWS, Piece, Segmenter, TextRow

_FEW, _MANY = 16, 2048
_MOST_EMPTY = 500_000
_MOST_JOINED = 20
_COMMENT = re.compile(r"^\s*(#+|%+|!+|//+|\*+)\s*")


def segment_text(lines: Iterable[str], cut: Cut) -> list[Piece]:
    """The pieces of a text file. Raises Unreadable."""
    return _Reader(lines, cut).pieces()


class _Reader:
    """Goes through the lines once; `_buffer` are lines looked at, from `_line` on."""

    def __init__(self, lines: Iterable[str], cut: Cut) -> None:
        self._lines, self._cut = iter(lines), cut
        if cut.pairs:
            self._lines = _opened(self._lines, cut.delimiter)
        self._buffer: list[str] = []
        self._line = 1
        self._empty = 0
        self._segmenter = Segmenter(cut.style)
        self._split = cut.splitter()
        self._between = None if cut.delimiter == BLANKS else cut.delimiter
        self._parted = line_pattern(cut.style, self._between or "").fullmatch
        opens = "" if self._between is None else rf"|{re.escape(cut.delimiter)}"
        self._opens = re.compile(rf'(?:^{opens})\s*"[^"]*$')
        self._closes = re.compile(rf'^[^"]*"\s*(?:${opens})')

    def pieces(self) -> list[Piece]:
        size = _FEW
        while self._fill(size):
            if self._segmenter.width and self._at_once(self._buffer[:size]):
                self._drop(size)
                size = min(2 * size, _MANY)
            elif size > _FEW:
                size = _FEW
            else:
                self._one_by_one(_FEW)
        return self._segmenter.finish()

    def _fill(self, size: int) -> bool:
        if len(self._buffer) < size:
            self._buffer += islice(self._lines, size - len(self._buffer))
        return bool(self._buffer)

    def _drop(self, count: int) -> None:
        self._line += min(count, len(self._buffer))
        del self._buffer[:count]

    # Whole stretches

    def _at_once(self, chunk: list[str]) -> bool:
        """Take lines that are all rows of the table under way; False, and nothing taken, where one
        may be something else."""
        numbers: Sequence[int] = range(self._line, self._line + len(chunk))
        if "" in chunk:
            filled = [i for i, line in enumerate(chunk) if line]
            self._count_empty(len(chunk) - len(filled))
            numbers, chunk = [self._line + i for i in filled], [chunk[i] for i in filled]
            if not chunk:
                return True
        text = "\n".join(chunk)
        between, style = self._between, self._cut.style
        if '"' in text:
            between = '"\x1f"'
            plain = _unquoted(chunk, self._between)
            if plain is None:
                return False
            text = plain
        elif self._cut.delimiter in (style.decimal_sign, style.thousands):
            return False
        # Python's numbers may hold underscores; other signs need a closer look.
        if "_" in text:
            return False
        if style.thousands and style.thousands in text:
            if not all(map(self._parted, chunk)):
                return False
            text = text.replace(style.thousands, "")
        elif style.decimal_sign == "," and "." in text:
            return False
        if style.decimal_sign == ",":
            text = text.replace(",", ".")
        cells = _cells(text, between, self._segmenter.width)
        return cells is not None and self._segmenter.stretch(numbers, cells)

    # Line by line

    def _one_by_one(self, count: int) -> None:
        at = 0
        while at < min(count, len(self._buffer)):
            line, raw = self._line + at, self._buffer[at]
            at += 1
            if not raw or raw.isspace():
                self._count_empty(1)
                continue
            if raw.count('"') % 2 and self._opens.search(raw):
                more = self._closing(at)
                raw = " ".join([raw, *self._buffer[at : at + more]])
                at += more
            found = _COMMENT.match(raw)
            if found:
                bare = raw[found.end() :]
                self._segmenter.text(TextRow(line, tuple(self._split(bare)), bare, comment=True))
                continue
            cells = self._split(raw)
            if any(cells):
                self._segmenter.row(line, cells, raw)
        self._drop(at)

    def _closing(self, at: int) -> int:
        """How many further lines a cell in quotation marks goes on for; none where it does not
        end."""
        self._fill(at + _MOST_JOINED)
        for i, line in enumerate(self._buffer[at : at + _MOST_JOINED], start=1):
            if '"' in line:
                if not self._closes.match(line):
                    return 0
                if not self._opens.search(line):
                    return i
        return 0

    def _count_empty(self, count: int) -> None:
        self._empty += count
        if self._empty > _MOST_EMPTY:
            raise Unreadable(f"The file has over {_MOST_EMPTY} empty lines: take them out.")


def _opened(lines: Iterator[str], delimiter: str) -> Iterator[str]:
    """Lines with their complex numbers written as two cells."""
    opened = opener(delimiter)
    count = 0
    for line in lines:
        plain = opened(line)
        count += plain != line
        if count > MOST_ODD_ROWS:
            raise Unreadable(f"The file has over {MOST_ODD_ROWS} complex numbers: split it.")
        yield plain


def _unquoted(chunk: list[str], between: str | None) -> str | None:
    """Lines whose cells all stand in quotation marks, with these still between the cells; None for
    any other."""
    if between is None or not all(line[0] == '"' == line[-1] for line in chunk):
        return None
    text = "\n".join(line[1:-1] for line in chunk).replace(f'"{between}"', '"\x1f"')
    return text if text.count('"') == 2 * text.count("\x1f") else None


def _cells(text: str, between: str | None, width: int) -> list[str] | None:
    """The cells of all lines, where each has so many; one more may stand empty at the end."""
    lines = text.split("\n")
    if between is None:
        return text.split() if {len(line.split()) for line in lines} == {width} else None
    marks = {line.count(between) for line in lines}
    if marks == {width} and all(line.endswith(between) for line in lines):
        text = text.replace(f"{between}\n", "\n").removesuffix(between)
    elif marks != {width - 1}:
        return None
    return text.replace("\n", between).split(between)
