"""From a section to arrays: the numbers of each group of columns, checked cell by cell."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from coatgui.intake.behaviour import columns_by_behaviour
from coatgui.intake.conditions import CONDITIONS, condition, span
from coatgui.intake.errors import Unclear, Unreadable
from coatgui.intake.headings import Meaning
from coatgui.intake.impedance import FREQUENCY_ROLES, way_of
from coatgui.intake.labels import moment_in, time_in
from coatgui.intake.layout import Said, Section
from coatgui.intake.segments import Block
from coatgui.intake.units import Unit, kind_of
from coatgui.records import BoolArray, Column, FloatArray

_UNITS_TAKEN = {"frequency": "Hz", "impedance": "Ω", "admittance": "S", "capacitance": "F"}


@dataclass(eq=False)
class Extract:
    """One group of columns of one block. `values` are the written numbers (R,) by role, not yet
    multiplied by the factors of `columns`; `lines` (R,) lines
    of the file. `hours` (R,) and `panels` (R,) are there where columns say so; `conditions` (R,) by
    role, not yet multiplied, NaN where there is none."""

    columns: tuple[Column, ...]
    way: tuple[str, str]
    values: dict[str, FloatArray]
    lines: np.ndarray
    said: Said
    hours: FloatArray | None = None
    panels: list[str] | None = None
    conditions: dict[str, FloatArray] = field(default_factory=dict)
    per_area: bool = False
    hours_in_words: bool = False
    told: bool = False
    remarks: list[str] = field(default_factory=list)
    doubts: list[str] = field(default_factory=list)

    def column(self, role: str) -> Column:
        return next(column for column in self.columns if column.role == role)

    def set_factor(self, role: str, factor: float, unit: str | None = None) -> None:
        self.columns = tuple(
            replace(c, factor=factor, unit=c.unit if unit is None else unit)
            if c.role == role
            else c
            for c in self.columns
        )

    def span(self, role: str, rows: np.ndarray) -> tuple[float, float] | None:
        """Lowest and highest of a condition over some rows, in °C or mV."""
        values = self.conditions.get(role)
        return None if values is None else span(self.column(role), values[rows])

    def scaled(self) -> dict[str, FloatArray]:
        """Values by role in Hz, rad/s, Ω, S, F or rad; logarithms are resolved."""
        result = {}
        for role, written in self.values.items():
            factor = self.column(role).factor
            with np.errstate(over="ignore"):
                plain = 10.0**written if role.startswith("log_") else written
                result[role] = plain * factor
        return result


def extracts_of(section: Section) -> list[Extract]:
    """What a section's groups of columns hold. Raises Unreadable or Unclear."""
    if not section.groups:
        block = section.block
        is_word = [_is_words(block, i) for i in range(block.width)]
        columns = columns_by_behaviour(block.table(), is_word)
        made = extract(section, columns, section.said, alone=True)
        unknown = _headings_not_understood(section)
        if unknown:
            made.doubts.append(
                f"The headings '{unknown[:60]}' were not understood: the columns were recognised "
                "by their numbers."
            )
        else:
            made.remarks.append("No headings: the columns were recognised by their numbers.")
        return [made]
    result = []
    for group, said in section.groups:
        columns, per_area, remarks = _columns(section, group)
        both = Said(
            said.panel or section.said.panel,
            section.said.hours if said.hours is None else said.hours,
            section.said.moment,
            section.said.moment_unsure,
        )
        made = extract(section, columns, both, alone=len(section.groups) == 1)
        made.per_area = per_area
        made.remarks += remarks
        result.append(made)
    return result


def _headings_not_understood(section: Section) -> str:
    """A row of words, one over each column, right above the numbers."""
    row = section.between[-1] if section.between else None
    if row is None or section.block.lines[0] - row.line > 2:
        return ""
    words = [cell for cell in row.cells if isinstance(cell, str) and cell]
    return ", ".join(words) if len(words) >= section.written else ""


def _columns(section: Section, group: list[int]) -> tuple[tuple[Column, ...], bool, list[str]]:
    """The columns of a section as one group sees them; others are "other"."""
    roles: dict[int, str] = {}
    for i in group:
        what = section.meanings[i]
        assert what is not None
        role = f"log_{what.role}" if what.logarithm else what.role
        if role in roles.values():
            role = "other"
        roles[i] = role
    way = way_of(roles.values())
    frequency = next(role for role in FREQUENCY_ROLES if role in roles.values())
    needed = (frequency, *way)
    conditions = _conditions(section, roles)
    columns, remarks, areas, taken = [], [], set(), set()
    for i, heading in enumerate(section.headings):
        if i in conditions:
            columns.append(conditions[i])
            continue
        role = roles.get(i, "other")
        what = section.meanings[i]
        if what is None or role == "other" or role in ("panel", "date"):
            columns.append(Column(i, heading, role, ""))
            continue
        unit = _unit(what, heading, section.units, needed=role in needed)
        if role in way and kind_of(what.role) != "angle":
            areas.add(unit is not None and unit.per_area)
        if role in (frequency, *way) and unit is None and kind_of(what.role) != "angle":
            taken.add(_UNITS_TAKEN.get(kind_of(what.role), "rad/s"))
        factor = 1.0 if unit is None else unit.factor
        columns.append(
            Column(i, heading, role, "" if unit is None else unit.written,
                   -factor if what.negative else factor)
        )  # fmt: skip
    if len(areas) > 1:
        raise Unclear("One part of the impedance is per area and the other is not: say which.")
    if taken:
        remarks.append(f"No unit is named: {' and '.join(sorted(taken))} were taken.")
    return tuple(columns), areas == {True}, remarks


def _conditions(section: Section, roles: Mapping[int, str]) -> dict[int, Column]:
    """Columns of temperature and potential, the first of each, where a table holds one spectrum at
    a time."""
    found: dict[str, Column] = {}
    if len(section.groups) > 1 or not section.own_headings:
        return {}
    below = section.between[-1].cells if section.between else []
    for i, heading in enumerate(section.headings):
        # "T/°C" has the letter of a time.
        if roles.get(i, "other") in ("other", "time"):
            unit = str(below[i]) if len(below) == len(section.headings) else ""
            told = condition(heading, unit)
            if told is not None and told[0] not in found:
                found[told[0]] = Column(i, heading, told[0], told[1].written, told[1].factor)
    return {column.position: column for column in found.values()}


def _unit(what: Meaning, heading: str, units: Mapping[str, Unit], *, needed: bool) -> Unit | None:
    unit = what.unit or units.get(kind_of(what.role))
    if not needed:
        return unit
    if what.unknown_unit and what.unit is None:
        raise Unclear(
            f"'{what.unknown_unit[:20]}' in the heading '{heading[:40]}' is no unit the program "
            "knows: say which unit the column is in."
        )
    if unit is not None and not unit.sure:
        raise Unclear(
            f"'{unit.written}' could mean milli or mega: say which unit '{heading[:40]}' is in."
        )
    return unit


def _is_words(block: Block, column: int) -> bool:
    return any(word for _, _, word in block.column_words(column))


def extract(section: Section, columns: tuple[Column, ...], said: Said, *, alone: bool) -> Extract:
    """The numbers of the columns that are used. A row in which a group beside others has nothing
    is not its own. Raises Unreadable with the line where a cell is missing or no number."""
    block = section.block
    roles = {c.role: c.position for c in columns if c.role != "other"}
    way = way_of(roles)
    frequency = next(role for role in FREQUENCY_ROLES if role in roles)
    used = [frequency, *way]
    used += [role for role in ("modulus", "log_modulus") if role in roles and role not in used]
    missing = {role: _missing(block, roles[role], columns) for role in used}
    own = missing[way[0]] & missing[way[1]]
    empty = own & missing[frequency] if alone else own
    for role in used:
        holes = missing[role] & ~empty
        if holes.any():
            line = block.lines[int(np.argmax(holes))]
            raise Unreadable(
                f"Line {line} lacks a number in column {roles[role] + 1}: the file may be cut "
                "short; export it again."
            )
    # Where every row is the group's own, views cost no memory.
    rows: np.ndarray | slice = np.flatnonzero(~empty) if empty.any() else slice(None)
    table = block.table()
    values = {role: table[rows, roles[role]] for role in used}
    lines = np.frombuffer(block.lines, dtype=np.int64)[rows]
    made = Extract(columns, way, values, lines, said)
    if "time" in roles:
        made.hours_in_words = _is_words(block, roles["time"])
        made.hours = _hours(block, columns, roles["time"], rows)
    made.conditions = {role: table[rows, roles[role]] for role in CONDITIONS if role in roles}
    if "panel" in roles:
        made.panels = _words(block, roles["panel"], rows)
    if "date" in roles and said.moment is None:
        moments = [moment_in(w) for w in dict.fromkeys(_words(block, roles["date"], rows))]
        if moments and moments[0][0] is not None:
            made.said = replace(said, moment=moments[0][0], moment_unsure=moments[0][1])
    return made


def _missing(block: Block, column: int, columns: tuple[Column, ...]) -> BoolArray:
    """(R,) True where a cell is empty. Raises Unreadable where it is no number."""
    missing = np.zeros(len(block), dtype=np.bool_)
    for start, stop, word in block.column_words(column):
        if word == "":
            missing[start:stop] = True
        elif word is not None:
            raise Unreadable(
                f"Line {block.lines[start]}, column {column + 1}: '{word[:40]}' is not a number; "
                "correct the file or export it again."
            )
    return missing


def _words(block: Block, column: int, rows: np.ndarray | slice) -> list[str]:
    """The cells of a column as words; numbers as they would be written."""
    numbers = block.table()[:, column]
    result: list[str] = []
    for start, stop, word in block.column_words(column):
        if word is None:
            result += [f"{value:g}" for value in numbers[start:stop].tolist()]
        else:
            result += [word] * (stop - start)
    return result[rows] if isinstance(rows, slice) else [result[i] for i in rows.tolist()]


def _hours(
    block: Block, columns: tuple[Column, ...], column: int, rows: np.ndarray | slice
) -> FloatArray | None:
    """Hours from a column of numbers or of words like "24 h"; None where it is no such column."""
    factor = next(c.factor for c in columns if c.position == column)
    hours = np.array(block.table()[:, column]) * factor
    for start, stop, word in block.column_words(column):
        if word is None:
            continue
        told, rest = time_in(word)
        if told is None or rest:
            return None
        hours[start:stop] = told
    return np.asarray(hours[rows], dtype=np.float64)
