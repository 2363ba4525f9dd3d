"""How the lines of a text file are cut into cells: delimiter and number style, found together."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from coatgui.intake.complex_cells import holds_complex, opener, pairs_in
from coatgui.intake.errors import NoSpectrum, Unclear
from coatgui.intake.numbers import Style, looks_numeric, number, style_of

BLANKS = " "
_DELIMITERS = (";", "\t", "|", ",", BLANKS)
_FEWEST_COLUMNS = 3
_HINT = re.compile(r"^\ufeff?sep=(.)$", re.IGNORECASE)
NOTHING = "The file holds no table of numbers: nothing to read."


@dataclass(frozen=True, slots=True)
class Cut:
    """A way to cut lines. `pairs` are where the real parts of complex numbers stand, which are one
    cell in the file and two once it is cut."""

    delimiter: str
    style: Style
    pairs: tuple[int, ...] = ()

    def splitter(self) -> Callable[[str], list[str]]:
        """Gives the cells of one line, trimmed, without empty last ones."""
        return _splitter(self.delimiter)


def _splitter(delimiter: str) -> Callable[[str], list[str]]:
    if delimiter == BLANKS:
        return str.split

    def split(line: str) -> list[str]:
        if '"' in line:
            try:
                (cells,) = list(csv.reader([line], delimiter=delimiter, skipinitialspace=True))
            except (csv.Error, ValueError):
                cells = line.split(delimiter)
        else:
            cells = line.split(delimiter)
        cells = [cell.strip() for cell in cells]
        while cells and not cells[-1]:
            cells.pop()
        return cells

    return split


def find_cut(sample: Sequence[str], delimiter: str = "", decimal_sign: str = "") -> Cut:
    """The cut under which most lines of the sample are rows of numbers of one width. What is given
    is taken as told. Raises NoSpectrum where no cut gives a table, Unclear where two do."""
    hint = next((_HINT.match(line) for line in sample[:1]), None)
    wanted: Sequence[str] = (delimiter,) if delimiter else (hint[1],) if hint else _DELIMITERS
    best: list[tuple[float, int, Cut]] = []
    opened: Sequence[str]
    unclear: Unclear | None = None
    for place, candidate in enumerate(wanted):
        if candidate != BLANKS and not any(candidate in line for line in sample):
            continue
        is_complex = holds_complex(sample, candidate)
        opened = list(map(opener(candidate), sample)) if is_complex else sample
        try:
            scored = _score(opened, candidate, decimal_sign)
        except Unclear as question:
            unclear = unclear or question
            continue
        if scored is not None:
            score, style = scored
            pairs = _usual_pairs(sample, candidate) if is_complex else ()
            best.append((score, -place, Cut(candidate, style, pairs)))
    if not best:
        raise unclear or NoSpectrum(NOTHING)
    return max(best, key=lambda entry: entry[:2])[2]


def _usual_pairs(sample: Sequence[str], delimiter: str) -> tuple[int, ...]:
    split = _splitter(delimiter)
    found = Counter(pairs_in(line, delimiter, split) for line in sample)
    del found[()]
    return found.most_common(1)[0][0] if found else ()


def _score(sample: Sequence[str], delimiter: str, decimal_sign: str) -> tuple[float, Style] | None:
    """Rows of the usual width times the share of numbers on them, with the style, or None."""
    split = _splitter(delimiter)
    rows = []
    for line in sample:
        cells = split(line)
        numeric = [cell for cell in cells if cell and looks_numeric(cell)]
        if len(numeric) >= _FEWEST_COLUMNS and 3 * len(numeric) >= len(cells):
            rows.append((cells, numeric))
    if not rows:
        return None
    width = Counter(len(cells) for cells, _ in rows).most_common(1)[0][0]
    usual = [(cells, numeric) for cells, numeric in rows if len(cells) == width]
    style = style_of((cell for _, numeric in usual for cell in numeric), decimal_sign)
    if style is None:
        return None
    # Quoted cells may hold the delimiter as one of their signs.
    if delimiter in (style.decimal_sign, style.thousands) and not any('"' in s for s in sample):
        return None
    read = sum(number(cell, style) is not None for _, numeric in usual for cell in numeric)
    cells_there = sum(sum(map(bool, cells)) for cells, _ in usual)
    return len(usual) * read / cells_there, style
