"""From cells to columns with a meaning: headings and units where there are any, else what the
numbers do."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coatgui.intake.decode import Grid, Unreadable, is_number, to_number
from coatgui.intake.headings import Meaning, meaning, unit_factor
from coatgui.records import Column, FloatArray

_WORDS_WITHOUT_NUMBERS = ("panel",)


@dataclass(frozen=True, eq=False)
class Table:
    """One table of a file. `numbers` (R, C) has NaN in columns of words; `words` holds those;
    `lines` (R) says on which line of the file each row stands, counted from 1."""

    columns: tuple[Column, ...]
    numbers: FloatArray
    words: dict[int, tuple[str, ...]]
    first_line: int
    lines: tuple[int, ...]
    remarks: tuple[str, ...]

    def place(self, role: str) -> int | None:
        return next((c.position for c in self.columns if c.role == role), None)

    def values(self, role: str) -> FloatArray | None:
        """The column of a role in Hz, rad/s, Ω, rad or h, or None."""
        column = next((c for c in self.columns if c.role == role), None)
        return None if column is None else self.numbers[:, column.position] * column.factor


def _numeric_cells(row: tuple[str, ...], decimal_sign: str) -> int:
    return sum(is_number(cell, decimal_sign) for cell in row)


def find_table(grid: Grid) -> Table:
    """The table of a text file. Raises Unreadable with the line where something is wrong."""
    sign = grid.decimal_sign
    lines = grid.lines
    counts = [_numeric_cells(row, sign) for row in lines]
    start = _first_data_line(counts, lines)
    width = len(lines[start])
    end = max(i for i, n in enumerate(counts) if n >= 2) + 1
    remarks: list[str] = []
    if any(any(row) for row in lines[end:]):
        remarks.append(f"Lines after {end} hold no numbers and were taken as a footer.")
    headings, meanings = _headings(lines, start, width)
    is_word = [meanings[i] is not None and _is_words(meanings[i]) for i in range(width)]
    if not any(meanings):
        is_word = [not is_number(cell, sign) for cell in lines[start]]
    rows: list[tuple[str, ...]] = []
    numbered: list[int] = []
    for number in range(start, end):
        row = lines[number]
        if not any(row):
            continue
        if headings and tuple(row[: len(headings)]) == tuple(headings):
            continue  # the heading said once more above a further block
        _check_row(row, width, is_word, sign, number)
        rows.append(row)
        numbered.append(number + 1)
    numbers = np.full((len(rows), width), np.nan)
    words: dict[int, tuple[str, ...]] = {}
    for i in range(width):
        if is_word[i]:
            words[i] = tuple(row[i] for row in rows)
        else:
            numbers[:, i] = [to_number(row[i], sign) for row in rows]
    if any(meanings):
        columns = _columns_by_heading(headings, meanings)
    else:
        columns, more = columns_by_behaviour(numbers, is_word)
        remarks += more
    return Table(columns, numbers, words, start + 1, tuple(numbered), tuple(remarks))


def _is_words(what: Meaning | None) -> bool:
    return what is not None and what.role in _WORDS_WITHOUT_NUMBERS


def _first_data_line(counts: list[int], lines: tuple[tuple[str, ...], ...]) -> int:
    """The first of three numeric lines of one width, so that numbers in a preamble do not count."""
    for i, n in enumerate(counts):
        follow = list(range(i, min(i + 3, len(counts))))
        if n >= 2 and all(counts[j] >= 2 and len(lines[j]) == len(lines[i]) for j in follow):
            return i
    raise Unreadable("The file holds no table of numbers of one width: nothing to read.")


def _check_row(
    row: tuple[str, ...], width: int, is_word: list[bool], sign: str, number: int
) -> None:
    if len(row) != width:
        raise Unreadable(
            f"Line {number + 1} has {len(row)} cells where the table has {width}: "
            "the file may be cut short; export it again."
        )
    for i, cell in enumerate(row):
        if not is_word[i] and not is_number(cell, sign):
            raise Unreadable(
                f"Line {number + 1}, column {i + 1}: '{cell[:40]}' is not a number; "
                "correct the file or export it again."
            )


def _headings(
    lines: tuple[tuple[str, ...], ...], start: int, width: int
) -> tuple[tuple[str, ...], list[Meaning | None]]:
    """Headings above the data, perhaps with a row of units between."""
    none: list[Meaning | None] = [None] * width
    above = [i for i in range(start - 1, max(start - 4, -1), -1) if any(lines[i])]
    for step, i in enumerate(above[:2]):
        row = (*lines[i], *("",) * width)[:width]
        found = [meaning(cell) if cell else None for cell in row]
        if sum(m is not None for m in found) < 2:
            continue
        if step == 1:
            units = (*lines[above[0]], *("",) * width)[:width]
            found = [_with_unit(m, unit) for m, unit in zip(found, units, strict=True)]
        return row, found
    return (), none


def _with_unit(what: Meaning | None, unit: str) -> Meaning | None:
    unit = unit.strip("[]() ")
    if what is None or what.unit or not unit:
        return what
    factor = unit_factor(what.role, unit)
    if factor is None:
        return what
    return Meaning(what.role, unit, factor * np.sign(what.factor))


def _columns_by_heading(
    headings: tuple[str, ...], meanings: list[Meaning | None]
) -> tuple[Column, ...]:
    columns = []
    taken: set[str] = set()
    for i, (heading, what) in enumerate(zip(headings, meanings, strict=True)):
        role = "other" if what is None or what.role in taken else what.role
        taken.add(role)
        if what is None or role == "other":
            columns.append(Column(i, heading, "other", ""))
        else:
            columns.append(Column(i, heading, role, what.unit, what.factor))
    roles = {c.role for c in columns}
    polar, cartesian = {"modulus", "phase"}, {"real", "imaginary"}
    if not roles & {"frequency", "angular_frequency"}:
        raise Unreadable("No column is headed as a frequency: name one 'frequency'.")
    if not (polar <= roles or cartesian <= roles):
        raise Unreadable(
            "The headings name neither real and imaginary part nor modulus and phase: "
            "name the two columns of the impedance."
        )
    return tuple(columns)


def _looks_like_frequency(values: FloatArray) -> bool:
    if values.size < 5 or not (values > 0).all():
        return False
    steps = np.diff(np.log(values))
    one_way = (steps < 0).all() or (steps > 0).all()
    span = np.log10(values.max() / values.min())
    return bool(one_way and span >= 2 and np.std(steps) < 0.5 * abs(np.mean(steps)))


def columns_by_behaviour(
    numbers: FloatArray, is_word: list[bool]
) -> tuple[tuple[Column, ...], list[str]]:
    """Columns without headings: frequency runs one way over decades in even steps; modulus and
    phase are told from real and imaginary part by what they do."""
    usable = [i for i in range(numbers.shape[1]) if not is_word[i]]
    frequencies = [i for i in usable if _looks_like_frequency(numbers[:, i])]
    if not frequencies:
        raise Unreadable(
            "There are no headings, and no column runs like a frequency: add a line of headings."
        )
    frequency = frequencies[0]
    index = np.arange(numbers.shape[0])
    rest = [
        i
        for i in usable
        if i != frequency and not np.allclose(np.diff(numbers[:, i]), 1.0) and i > frequency
    ]
    del index
    if len(rest) != 2:
        raise Unreadable(
            f"There are no headings, and beside the frequency stand {len(rest)} columns where two "
            "are wanted: add a line of headings."
        )
    first, second = numbers[:, rest[0]], numbers[:, rest[1]]
    remarks = ["No headings: the columns were recognised by their numbers."]
    polar = bool((first > 0).all() and np.abs(second).max() <= 200.0) and _is_polar(first, second)
    if polar:
        degrees = np.abs(second).max() > 3.2
        factor = np.pi / 180.0 if degrees else 1.0
        roles = (("modulus", "", 1.0), ("phase", "degrees" if degrees else "radians", factor))
    else:
        roles = (("real", "", 1.0), ("imaginary", "", 1.0))
    names = {frequency: ("frequency", "", 1.0), rest[0]: roles[0], rest[1]: roles[1]}
    columns = []
    for i in range(numbers.shape[1]):
        role, unit, factor = names.get(i, ("other", "", 1.0))
        columns.append(Column(i, "", role, unit, factor))
    return tuple(columns), remarks


def _is_polar(modulus: FloatArray, phase: FloatArray) -> bool:
    """A phase stays within a quarter turn (or nearly) while the modulus spans more than it."""
    size = np.abs(phase)
    as_degrees = size.max() > 3.2
    within = size.max() <= (135.0 if as_degrees else 2.4)
    return bool(within and modulus.min() > 3.0 * size.max())
