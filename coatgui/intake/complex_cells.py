"""Complex numbers in one cell: "1.2e6-3.4e5j", "1.2e6 - j 3.4e5", "(1.2e6, -3.4e5)"."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from functools import cache

from coatgui.intake.segments import Cell

_FEWEST = 3
_LOOKED_AT = 100
_MARK = "\x00"


@cache
def _pattern(delimiter: str) -> re.Pattern[str]:
    """A complex number and nothing else. A comma is no decimal sign where it parts cells. Numbers
    are atomic, so that a cell costs no more than its length."""
    exponent = r"(?>(?:[eEdD][+\-−]?\d{1,4})?)"
    point = rf"(?>\d+(?:\.\d+)*\.?|\.\d+){exponent}"
    comma = rf"(?>\d+(?:,\d+)*|,\d+){exponent}"
    number = point if delimiter == "," else rf"(?>\d+(?:[.,]\d+)*\.?|[.,]\d+){exponent}"
    forms = [
        rf"\(? *([+\-−]?{number}) *([+\-−]) *({number}) *\*? *[ij] *\)?",
        rf"\(? *([+\-−]?{number}) *([+\-−]) *[ij] *\*? *({number}) *\)?",
        rf"\( *([+\-−]?{point}) *[,; ] *([+\-−]?{point}) *\)",
    ]
    if delimiter != ",":
        forms.append(rf"\( *([+\-−]?{comma})(?: *; *|,? +)([+\-−]?{comma}) *\)")
    return re.compile("|".join(forms))


@cache
def _candidates(delimiter: str) -> re.Pattern[str]:
    """Cells that may be such a number: in brackets, or with i or j near the end."""
    d = re.escape(delimiter)
    inside = rf"[^{d}()]{{2,60}}"
    return re.compile(
        rf'(?<![^{d}])[ "]{{0,3}}(?:\([^()]{{3,80}}\)|{inside}[ij]|[^{d}ij]{{2,40}}[ij]{inside})'
        rf'[ "]{{0,3}}(?![^{d}])'
    )


def _parts(found: re.Match[str]) -> tuple[str, str]:
    real, *imaginary = [part for part in found.groups() if part is not None]
    return real, "".join(imaginary)


@cache
def opener(delimiter: str, mark: str = "") -> Callable[[str], str]:
    """A function that writes each complex number of a line as two cells, `mark` before them."""
    substitute, match = _candidates(delimiter).sub, _pattern(delimiter).fullmatch

    def two(cell: re.Match[str]) -> str:
        found = match(cell[0].strip(' "'))
        return f"{mark}{delimiter.join(_parts(found))}" if found else cell[0]

    return lambda line: substitute(two, line)


def holds_complex(sample: Sequence[str], delimiter: str) -> bool:
    """Whether complex numbers are what the lines with numbers consist of."""
    numbered = [line for line in sample if re.search(r"\d", line)][:_LOOKED_AT]
    opened = opener(delimiter)
    count = sum(any(c in line for c in "ij(") and opened(line) != line for line in numbered)
    return count >= _FEWEST and 2 * count > len(numbered)


def pairs_in(line: str, delimiter: str, split: Callable[[str], list[str]]) -> tuple[int, ...]:
    """Where the real parts of a line stand, once it is cut."""
    cells = split(opener(delimiter, _MARK)(line))
    return tuple(i for i, cell in enumerate(cells) if cell.startswith(_MARK))


def opened_sheet(
    rows: list[tuple[int, list[Cell]]],
) -> tuple[list[tuple[int, list[Cell]]], tuple[int, ...]]:
    """Rows of a sheet with a further column behind each that holds complex numbers, as the
    spreadsheet programs' own functions write them, and where the real parts stand then."""
    match = _pattern(";").fullmatch
    found: dict[int, int] = {}
    for _, cells in rows:
        for i, cell in enumerate(cells):
            if isinstance(cell, str) and cell[-1:] in "ij)" and cell and match(cell):
                found[i] = found.get(i, 0) + 1
    columns = {i for i, times in found.items() if times >= _FEWEST}
    if not columns:
        return rows, ()
    opened: list[tuple[int, list[Cell]]] = []
    for number, cells in rows:
        row: list[Cell] = []
        for i, cell in enumerate(cells):
            whole = match(cell) if i in columns and isinstance(cell, str) else None
            row += map(_plain, _parts(whole)) if whole else [cell, ""] if i in columns else [cell]
        while row and row[-1] == "":
            row.pop()
        opened.append((number, row))
    return opened, tuple(i + shift for shift, i in enumerate(sorted(columns)))


def _plain(text: str) -> Cell:
    try:
        return float(text.replace("−", "-"))
    except ValueError:
        return text
