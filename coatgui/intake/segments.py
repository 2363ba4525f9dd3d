"""Rows of cells, one at a time, to blocks of numbers and the rows of words between them.

A file is gone through once; of numbers only the numbers are kept, so that a large file costs
little more memory than what it says.
"""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from coatgui.intake.errors import Unreadable
from coatgui.intake.numbers import Style, number_reader
from coatgui.records import FloatArray

Cell = str | float
MOST_COLUMNS = 256
_MOST_TABLES = 4_000
MOST_ODD_ROWS = 100_000
_MOST_LABELS = 50_000
_MOST_WORDS = 4_000_000  # characters outside tables
_FEWEST_ROWS = 3
_BEGIN_A_NUMBER = frozenset("0123456789+-−.,")


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
    it is a number); `present` are the words of the last row."""

    width: int
    numbers: array[float] = field(default_factory=lambda: array("d"))
    lines: array[int] = field(default_factory=lambda: array("q"))
    words: dict[int, list[tuple[int, str | None]]] = field(default_factory=dict)
    present: dict[int, str] = field(default_factory=dict)
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
        self._number = number_reader(style)
        self._odd_rows = 0
        self._tables = 0
        self._labels = 0
        self._block: Block | None = None
        self._characters = 0

    def text(self, row: TextRow) -> None:
        self._close()
        self._characters += len(row.raw) or sum(len(str(cell)) for cell in row.cells)
        if self._characters > _MOST_WORDS or len(self.pieces) > MOST_ODD_ROWS:
            raise Unreadable("The file is mostly words: it holds no table worth reading.")
        self.pieces.append(row)

    def row(self, line: int, cells: Sequence[Cell], raw: str = "") -> None:
        """A row that was not read at a glance: numbers, words or both."""
        self._odd_rows += 1
        if self._odd_rows > MOST_ODD_ROWS:
            raise Unreadable(
                f"The file has over {MOST_ODD_ROWS} rows that are not plain numbers: split it."
            )
        read = self._number
        values: list[float] = []
        words: dict[int, str] = {}
        numeric = 0
        for i, cell in enumerate(cells):
            value = (
                cell
                if isinstance(cell, float)
                else read(cell)
                if cell[:1] in _BEGIN_A_NUMBER
                else None
            )
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

    @property
    def width(self) -> int:
        """Of the table under way, once it has a few rows; else 0."""
        block = self._block
        return block.width if block is not None and len(block.lines) >= _FEWEST_ROWS else 0

    def stretch(self, lines: Sequence[int], cells: list[str]) -> bool:
        """Many rows of the table under way at once, cell after cell: plain numbers, and the same
        words in the same columns as in the row before. False, and nothing taken, where a cell is
        anything else."""
        block = self._block
        assert block is not None
        width, present = block.width, block.present
        for i, word in present.items():
            if set(map(str.strip, set(cells[i::width]))) != {word}:
                return False
            cells[i::width] = ["0"] * len(lines)
        if width - len(present) < 2:
            return False
        try:
            values = array("d", map(float, cells))
        except ValueError:
            return False
        if not math.isfinite(sum(values)):
            return False
        if present:
            table = np.frombuffer(values, dtype=np.float64).reshape(-1, width)
            table[:, list(present)] = math.nan
        block.numbers += values
        block.lines.extend(lines)
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
                self._labels += 1
        if block.words:
            for i, runs in block.words.items():
                if i not in words and runs[-1][1] is not None:
                    runs.append((place, None))
        block.present = words
        if self._labels > _MOST_LABELS:
            raise Unreadable(
                f"The words in the table change over {_MOST_LABELS} times: split the file."
            )
        block.numbers.extend(values)
        block.lines.append(line)
        if place < _FEWEST_ROWS:
            block.first.append(TextRow(line, tuple(cells), raw))

    def _close(self) -> None:
        """A block of one or two rows may be numbers in a preamble: keep its rows as text, too."""
        if self._block is not None:
            self._tables += 1
            if self._tables > _MOST_TABLES:
                raise Unreadable(f"The file holds over {_MOST_TABLES} tables: split it.")
            self.pieces.append(self._block)
            self._block = None

    def finish(self) -> list[Piece]:
        self._close()
        return self.pieces


def segment_rows(rows: Iterable[tuple[int, Sequence[Cell]]], style: Style) -> list[Piece]:
    """The pieces of a sheet, from (row number, cells)."""
    segmenter = Segmenter(style)
    for line, cells in rows:
        if any(cell != "" for cell in cells):
            segmenter.row(line, cells)
    return segmenter.finish()
