"""Rows of cells, one at a time, to blocks of numbers and the rows of words between them.

A file is gone through once; of numbers only the numbers are kept, so that a large file costs
little more memory than what it says.
"""

from __future__ import annotations

import math
import re
from array import array
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from coatgui.intake.cut import BLANKS, Cut
from coatgui.intake.errors import Unreadable
from coatgui.intake.numbers import Style, number
from coatgui.records import FloatArray

Cell = str | float
MOST_COLUMNS = 500
_MOST_WORDS = 20_000_000  # characters outside tables
_FEWEST_ROWS = 3
_COMMENT = re.compile(r"^\s*(#+|%+|!+|//+|\*+)\s*")


@dataclass(frozen=True, slots=True)
class TextRow:
    """A row that is no row of numbers. `line` counts from 1; `raw` is empty on a sheet."""

    line: int
    cells: tuple[Cell, ...]
    raw: str = ""
    comment: bool = False


@dataclass(eq=False)
class Block:
    """Consecutive rows of numbers. `numbers` is flat, row by row; cells that are words or empty
    are NaN there, and `words` says for each column which word holds from which row on (None where
    it is a number)."""

    width: int
    numbers: array[float] = field(default_factory=lambda: array("d"))
    lines: array[int] = field(default_factory=lambda: array("q"))
    words: dict[int, list[tuple[int, str | None]]] = field(default_factory=dict)
    first: list[TextRow] = field(default_factory=list)

    def __len__(self) -> int:
        return len(self.lines)

    def table(self) -> FloatArray:
        """(rows, columns)"""
        return np.frombuffer(self.numbers, dtype=np.float64).reshape(-1, self.width)

    def column_words(self, column: int) -> Iterator[tuple[int, int, str | None]]:
        """Runs of rows with one word: from, up to, word; None for numbers."""
        runs = self.words.get(column, [])
        if not runs or runs[0][0] > 0:
            yield 0, runs[0][0] if runs else len(self), None
        for i, (start, word) in enumerate(runs):
            yield start, runs[i + 1][0] if i + 1 < len(runs) else len(self), word


Piece = TextRow | Block


class Segmenter:
    """Takes rows and collects `pieces`, in their order. Ends with `finish`."""

    def __init__(self, style: Style) -> None:
        self.pieces: list[Piece] = []
        self._style = style
        self._block: Block | None = None
        self._characters = 0

    def text(self, row: TextRow) -> None:
        self._close()
        self._characters += len(row.raw) or sum(len(str(cell)) for cell in row.cells)
        if self._characters > _MOST_WORDS:
            raise Unreadable("The file is mostly words: it holds no table worth reading.")
        self.pieces.append(row)

    def row(self, line: int, cells: Sequence[Cell], raw: str = "") -> None:
        """A row that was not read at a glance: numbers, words or both."""
        values: list[float] = []
        words: dict[int, str] = {}
        numeric = 0
        for i, cell in enumerate(cells):
            value = cell if isinstance(cell, float) else number(cell, self._style)
            if value is None:
                values.append(math.nan)
                words[i] = str(cell)
            else:
                values.append(value)
                numeric += 1
        there = sum(cell != "" for cell in cells)
        if numeric < 2 or 3 * numeric < there:
            self.text(TextRow(line, tuple(cells), raw))
        else:
            self.numbers(line, values, words, cells, raw)

    def more(self, line: int, values: list[float]) -> bool:
        """A row of nothing but numbers in a table under way, the usual case; False where it is
        anything else and wants a closer look."""
        block = self._block
        if block is None or block.words or len(values) != block.width:
            return False
        if len(block.lines) < _FEWEST_ROWS or not math.isfinite(sum(values)):
            return False
        block.numbers.extend(values)
        block.lines.append(line)
        return True

    def numbers(
        self,
        line: int,
        values: list[float],
        words: dict[int, str],
        cells: Sequence[Cell],
        raw: str = "",
    ) -> None:
        """A row of numbers; `words` are the cells that are none, "" for empty ones."""
        block = self._block
        if block is not None and len(values) > block.width:
            self._close()
            block = None
        if block is None:
            if len(values) > MOST_COLUMNS:
                raise Unreadable(f"Line {line} has over {MOST_COLUMNS} columns: split the table.")
            block = self._block = Block(len(values))
        place = len(block)
        for i in range(len(values), block.width):
            values.append(math.nan)
            words = {**words, i: ""}
        for i, word in words.items():
            runs = block.words.setdefault(i, [])
            if not runs or runs[-1][1] != word:
                runs.append((place, word))
        if block.words:
            for i, runs in block.words.items():
                if i not in words and runs[-1][1] is not None:
                    runs.append((place, None))
        block.numbers.extend(values)
        block.lines.append(line)
        if place < _FEWEST_ROWS:
            block.first.append(TextRow(line, tuple(cells), raw))

    def _close(self) -> None:
        """A block of one or two rows may be numbers in a preamble: keep its rows as text, too."""
        if self._block is not None:
            self.pieces.append(self._block)
            self._block = None

    def finish(self) -> list[Piece]:
        self._close()
        return self.pieces


def segment_text(lines: Iterable[str], cut: Cut) -> list[Piece]:
    """The pieces of a text file."""
    segmenter = Segmenter(cut.style)
    split = cut.splitter()
    between = None if cut.delimiter == BLANKS else cut.delimiter
    comma = cut.style.decimal_sign == ","
    at_a_glance = not cut.style.thousands and not (comma and cut.delimiter == ",")
    for line, raw in enumerate(lines, start=1):
        # Python's numbers may hold underscores; a point among decimal commas needs a closer look.
        if at_a_glance and "_" not in raw and not (comma and "." in raw):
            plain = raw.replace(",", ".") if comma else raw
            try:
                values = list(map(float, plain.split(between)))
            except ValueError:
                pass
            else:
                if segmenter.more(line, values):
                    continue
        found = _COMMENT.match(raw)
        if found:
            bare = raw[found.end() :]
            segmenter.text(TextRow(line, tuple(split(bare)), bare, comment=True))
            continue
        cells = split(raw)
        if any(cells):
            segmenter.row(line, cells, raw)
    return segmenter.finish()


def segment_rows(rows: Iterable[tuple[int, Sequence[Cell]]], style: Style) -> list[Piece]:
    """The pieces of a sheet, from (row number, cells)."""
    segmenter = Segmenter(style)
    for line, cells in rows:
        if any(cell != "" for cell in cells):
            segmenter.row(line, cells)
    return segmenter.finish()
