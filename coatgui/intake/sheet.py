"""A sheet of a workbook: its rows, and the tables that stand anywhere on it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from coatgui.intake.complex_cells import opened_sheet
from coatgui.intake.errors import Unclear
from coatgui.intake.numbers import Style, looks_numeric, style_of
from coatgui.intake.segments import Cell

_FEWEST_IN_COLUMN = 5


@dataclass(eq=False)
class Sheet:
    """`rows` are (row number from 1, cells from column A on); only rows that hold something.
    `pairs` are where the real parts of complex numbers stand; a column for the other part was put
    in."""

    title: str
    rows: list[tuple[int, list[Cell]]]
    style: Style = field(default_factory=Style)
    pairs: tuple[int, ...] = ()

    @property
    def holds_numbers(self) -> bool:
        return any(isinstance(cell, float) for _, cells in self.rows for cell in cells)

    def tables(self) -> Iterator[list[tuple[int, list[Cell]]]]:
        """The sheet, once for every set of tables that begin in the same row; other tables are
        blanked out, so that tables side by side do not run into each other."""
        bands = self._bands()
        starts: dict[int, list[tuple[int, int]]] = {}
        for first, stop, row in bands:
            starts.setdefault(row, []).append((first, stop))
        if len(starts) <= 1:
            yield self.rows
            return
        for own in starts.values():
            others = [(a, b) for a, b, _ in bands if (a, b) not in own]
            yield [(number, _without(cells, others)) for number, cells in self.rows]

    def _bands(self) -> list[tuple[int, int, int]]:
        """Columns that stand together and hold numbers: first, up to, first row of numbers."""
        filled: dict[int, int] = {}
        numbers: dict[int, int] = {}
        first_row: dict[int, int] = {}
        for number, cells in self.rows:
            for i, cell in enumerate(cells):
                if cell == "":
                    continue
                filled[i] = filled.get(i, 0) + 1
                if isinstance(cell, float):
                    numbers[i] = numbers.get(i, 0) + 1
                    # Three numbers below each other are a column; one may be anything.
                    if numbers[i] == 1:
                        first_row[i] = number
        columns = sorted(i for i, n in filled.items() if n >= _FEWEST_IN_COLUMN)
        bands: list[tuple[int, int, int]] = []
        start = None
        for i in columns:
            if start is None or i - 1 not in columns:
                start = i
                bands.append((i, i + 1, 0))
            bands[-1] = (bands[-1][0], i + 1, 0)
        result = []
        for a, b, _ in bands:
            rows = [first_row[i] for i in range(a, b) if numbers.get(i, 0) >= _FEWEST_IN_COLUMN]
            if len(rows) >= 1:
                result.append((a, b, min(rows)))
        return result


def _without(cells: Sequence[Cell], bands: Sequence[tuple[int, int]]) -> list[Cell]:
    kept: list[Cell] = [
        "" if any(a <= i < b for a, b in bands) else cell for i, cell in enumerate(cells)
    ]
    while kept and kept[-1] == "":
        kept.pop()
    return kept


def with_style(sheet: Sheet) -> Sheet:
    """Numbers that are kept as text, with a decimal comma perhaps, or complex."""
    sheet.rows, sheet.pairs = opened_sheet(sheet.rows)
    texts = [c for _, cells in sheet.rows for c in cells if isinstance(c, str) and looks_numeric(c)]
    try:
        sheet.style = style_of(texts) or Style()
    except Unclear:
        sheet.style = Style()
    return sheet
