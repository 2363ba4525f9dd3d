"""What stands above a block of numbers: headings, units, and whose spectra they are."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from datetime import datetime
from itertools import pairwise

from coatgui.intake.headings import Meaning, meaning, take_unit
from coatgui.intake.labels import label_in, moment_in, time_in
from coatgui.intake.segments import Block, Piece, TextRow
from coatgui.intake.units import Unit, data, kind_of, unit_of

FREQUENCIES = ("frequency", "angular_frequency")
SHARED = ("time", "panel", "date")
_KINDS = ("frequency", "angular_frequency", "impedance", "admittance", "capacitance", "angle")
_ROWS_LOOKED_AT = 8
_ROWS_WITH_UNITS = 60
_MOST_WORDS_IN_HEADINGS = 60
_LONGEST_WITH_UNITS = 1_000
_PARTINGS = (
    ("\t", r"\t+"),
    (" ", r"\s{2,}|\t"),
    (";", r"\s*;\s*"),
    (",", r"\s*,\s*"),
    ("|", r"\s*\|\s*"),
)
_OF_COMPLEX = {
    "modulus": ("real", "imaginary"),
    "admittance_modulus": ("admittance_real", "admittance_imaginary"),
}
_KEY_AND_VALUE = re.compile(r"^\s*([^:=]{1,40}?)\s*[:=]\s*(\S.*)$")


@dataclass(frozen=True)
class Said:
    """What rows above a block say about its spectra."""

    panel: str = ""
    hours: float | None = None
    moment: datetime | None = None
    moment_unsure: bool = False


@dataclass(eq=False)
class Section:
    """A block of numbers with the meaning of its columns (None where unknown). `groups` are the
    columns that belong together, with what is said of each; without headings there are none.
    `written` is how many columns the file itself has."""

    block: Block
    headings: tuple[str, ...]
    meanings: list[Meaning | None]
    groups: list[tuple[list[int], Said]]
    said: Said
    units: dict[str, Unit]
    own_headings: bool
    written: int
    between: list[TextRow] = field(default_factory=list)


def sections_of(
    pieces: Sequence[Piece], pairs: Sequence[int] = ()
) -> tuple[list[Section], list[TextRow]]:
    """Every block of at least one row under headings, or of at least three rows, and the rows that
    follow the last one. `pairs` are where the real parts of complex numbers stand."""
    sections: list[Section] = []
    rows: list[TextRow] = []
    units: dict[str, Unit] = {}
    for piece in pieces:
        if isinstance(piece, TextRow):
            rows.append(piece)
            continue
        for row in rows[-_ROWS_WITH_UNITS:]:
            units = {**units, **_units_in(row)}
        previous = sections[-1] if sections else None
        section = _section(piece, rows, units, previous, pairs)
        if section is None:
            rows += piece.first  # a row or two of numbers in a preamble
            continue
        section.between = rows
        sections.append(section)
        rows = []
    return sections, rows


def _section(
    block: Block,
    rows: list[TextRow],
    units: dict[str, Unit],
    previous: Section | None,
    pairs: Sequence[int],
) -> Section | None:
    pairs = [i for i in pairs if i + 1 < block.width]
    place, headings, meanings = _find_headings(rows, block.width, pairs)
    above = rows if place is None else rows[:place]
    if place is None:
        if previous is not None and previous.block.width == block.width:
            headings, meanings = previous.headings, previous.meanings
        elif len(block) < 3:
            return None
    else:
        for row in rows[place + 1 :]:
            _take_units(meanings, row, block.width, pairs)
    said = _said(above, bare=place is None or previous is not None)
    if place is not None and said.hours is None:
        said = _with_label_below(said, rows[place + 1 :])
    labels = _labels_above(above, rows[place].line if place is not None else None, pairs)
    groups = _groups(meanings, labels) if any(meanings) else []
    written = block.width - len(pairs)
    return Section(block, headings, meanings, groups, said, dict(units), place is not None, written)


# ---------------------------------------------------------------------------------------------
# Headings


def _find_headings(
    rows: list[TextRow], width: int, pairs: Sequence[int]
) -> tuple[int | None, tuple[str, ...], list[Meaning | None]]:
    """The row of headings nearest to the block, as its place among the rows."""
    for place in range(len(rows) - 1, max(len(rows) - _ROWS_LOOKED_AT, 0) - 1, -1):
        for cells in _alignments(rows[place], width, pairs):
            found = [meaning(cell) if cell else None for cell in cells]
            for i in pairs:
                found[i : i + 2] = _parts_of(found[i])
            roles = [m.role for m in found if m is not None]
            values = sum(role not in (*FREQUENCIES, *SHARED) for role in roles)
            if values >= 2 or (values and any(role in FREQUENCIES for role in roles)):
                return place, tuple(cells), found
    none: list[Meaning | None] = [None] * width
    return None, ("",) * width, none


def _parts_of(what: Meaning | None) -> list[Meaning | None]:
    """What the two columns are that one heading over complex numbers means."""
    if what is None or what.logarithm or what.role not in _OF_COMPLEX:
        return [None, None]
    real, imaginary = _OF_COMPLEX[what.role]
    return [replace(what, role=real), replace(what, role=imaginary)]


def _alignments(row: TextRow, width: int, pairs: Sequence[int]) -> list[list[str]]:
    """Ways to lay a row over the columns: as it was cut, or cut otherwise where that does not fit,
    for headings may hold blanks, or stand under another delimiter than the numbers. One cell over a
    complex number counts for both its columns."""
    cells = [str(cell) for cell in row.cells]
    if not row.raw:  # on a sheet, the column for the other part was put in
        cells = [cell for i, cell in enumerate(cells) if i - 1 not in pairs]
    narrow = width - len(pairs)
    ways = []
    if len(cells) != narrow and row.raw:
        for sign, pattern in _PARTINGS:
            marks = row.raw.count(sign)
            if marks < narrow - 1 or (marks > narrow - 1 and not sign.isspace()):
                continue
            parted = [cell.strip() for cell in re.split(pattern, row.raw.strip())]
            if len(parted) == narrow:
                ways.append(parted)
        best = _best_parting(row.raw.split(), narrow)
        if best is not None:
            ways.append(best)
    ways.append((cells + [""] * narrow)[:narrow])
    for way in ways:
        for i in pairs:
            way.insert(i + 1, way[i])
    return ways


def _best_parting(words: list[str], width: int) -> list[str] | None:
    """The words as `width` headings, so that most of them mean something."""
    if not width <= len(words) <= _MOST_WORDS_IN_HEADINGS:
        return None
    best: list[dict[int, tuple[int, list[str]]]] = [{0: (0, [])}]
    for end in range(1, len(words) + 1):
        ways: dict[int, tuple[int, list[str]]] = {}
        for start in range(max(0, end - 6), end):
            text = " ".join(words[start:end])
            what = meaning(text)
            worth = 0 if what is None else 2 + (what.unit is not None) - 3 * bool(what.unknown_unit)
            for number, (score, cells) in best[start].items():
                if number < width and ways.get(number + 1, (-1, []))[0] < score + worth:
                    ways[number + 1] = (score + worth, [*cells, text])
        best.append(ways)
    found = best[-1].get(width)
    return None if found is None else found[1]


def _take_units(
    meanings: list[Meaning | None], row: TextRow, width: int, pairs: Sequence[int]
) -> None:
    """A row of units between headings and numbers."""
    given = [str(cell) for cell in row.cells if cell != ""]
    wanting = [i for i, m in enumerate(meanings) if m is not None and kind_of(m.role)]
    ways = _alignments(row, width, pairs)
    if len(row.cells) != width and len(given) == len(wanting):
        # Blanks part the cells, and a column of words has no unit to fill its place.
        over = dict(zip(wanting, given, strict=True))
        ways.insert(0, [over.get(i, "") for i in range(width)])
    for cells in ways:
        taken = [
            take_unit(what, cell) if what is not None and what.unit is None and cell else None
            for what, cell in zip(meanings, cells, strict=True)
        ]
        if any(taken):
            for i, (what, cell) in enumerate(zip(meanings, cells, strict=True)):
                if taken[i] is not None:
                    meanings[i] = taken[i]
                elif what is not None and what.unit is None and cell and kind_of(what.role):
                    meanings[i] = replace(what, unknown_unit=cell.strip("[]() "))
            return


def _units_in(row: TextRow) -> dict[str, Unit]:
    """Units that a preamble names: "Impedance in kOhm", "Units: Hz, Ohm, deg"."""
    text = row.raw or " ; ".join(str(cell) for cell in row.cells)
    found: dict[str, Unit] = {}
    if len(text) > _LONGEST_WITH_UNITS:
        return found
    opening, colon, rest = text.partition(":")
    is_list = bool(colon) and re.search(r"unit|einheit|unid", opening.casefold()) is not None
    for part in re.split(r"[;,\t|]", rest if is_list else text):
        words = part.strip(" .:").split()
        if not words or len(words) > 8:
            continue
        for kind in _KINDS:
            unit = unit_of(words[-1], kind)
            if unit is None or kind in found:
                continue
            named = meaning(" ".join(words[:-1]).removesuffix(" in").rstrip(" :="))
            fits = named is not None and kind_of(named.role) == kind
            if fits or (is_list and len(words) == 1 and kind not in ("admittance", "capacitance")):
                found[kind] = unit
    return found


# ---------------------------------------------------------------------------------------------
# Whose spectra they are


def _said(rows: list[TextRow], bare: bool) -> Said:
    """From lines like "Exposure: 24 h", "Panel;A1", "Date: 2026-03-01 14:20"; and, where `bare`,
    from a line that is nothing but a label."""
    said = Said()
    for row in rows[-_ROWS_WITH_UNITS:]:
        cells = [str(cell).strip() for cell in row.cells if cell != ""]
        if len(cells) == 1:
            cells = [cell.strip() for cell in re.split(r"[;\t|,]", cells[0]) if cell.strip()]
        pairs = [tuple(cells)] if len(cells) == 2 else []
        found = _KEY_AND_VALUE.match(row.raw or " ".join(cells))
        if found:
            pairs.append((found[1], found[2].strip(' ;,\t|"')))
        for key, value in pairs:
            said = _with_pair(said, key, value)
    if bare and rows and said == Said():
        text = (rows[-1].raw or " ".join(str(c) for c in rows[-1].cells if c != "")).strip(" ;,\t|")
        panel, hours = label_in(text)
        if hours is not None and len(panel.split()) <= 2:
            said = Said(panel, hours)
    return said


def _with_label_below(said: Said, rows: list[TextRow]) -> Said:
    """A label between the headings and the first of several blocks."""
    label = _said(rows[-1:], bare=True)
    return replace(said, panel=said.panel or label.panel, hours=label.hours)


def _with_pair(said: Said, key: str, value: str) -> Said:
    what = meaning(key.strip(" :="))
    if what is None:
        return said
    if what.role == "panel" and not said.panel:
        return replace(said, panel=value[:60])
    if what.role == "date":
        moment, unsure = moment_in(value)
        return said if moment is None else replace(said, moment=moment, moment_unsure=unsure)
    # A plain "time" may be the time of day or how long the sweep took.
    names_exposure = re.search(r"[^\W\d]{5,}", key) and meaning_is_exposure(key)
    if what.role == "time" and said.hours is None and names_exposure:
        hours, rest = time_in(value)
        if hours is None and what.unit is not None and re.fullmatch(r"\d+([.,]\d+)?", value):
            hours, rest = float(value.replace(",", ".")) * what.unit.factor, ""
        if hours is not None and not rest:
            return replace(said, hours=hours)
    return said


def meaning_is_exposure(text: str) -> bool:
    """Whether a text speaks of exposure, and not of any time."""
    words = re.findall(r"[^\W\d_]+", text.casefold())
    return any(word in data()["notion"]["exposure"] for word in words)


def _labels_above(
    rows: list[TextRow], heading_line: int | None, pairs: Sequence[int]
) -> dict[int, tuple[str, float]]:
    """Labels over groups of columns, by position, from the row directly above the headings."""
    if heading_line is None or not rows or heading_line - rows[-1].line > 2:
        return {}
    labels = {}
    for i, cell in enumerate(rows[-1].cells):
        if cell == "":
            continue
        if rows[-1].raw:
            for real in pairs:
                i += real < i
        panel, hours = label_in(f"{cell:g}" if isinstance(cell, float) else cell)
        if panel or hours is not None:
            labels[i] = (panel, -1.0 if hours is None else hours)
    return labels


# ---------------------------------------------------------------------------------------------
# Groups of columns


def _groups(
    meanings: list[Meaning | None], labels: dict[int, tuple[str, float]]
) -> list[tuple[list[int], Said]]:
    roles = ["" if m is None else m.role for m in meanings]
    frequencies = [i for i, role in enumerate(roles) if role in FREQUENCIES]
    several = len(frequencies) > len({roles[i] for i in frequencies})
    if several:
        own = _by_frequency(roles, frequencies)
        common: list[int] = [
            i for i, role in enumerate(roles) if role in SHARED and not any(i in g for g in own)
        ]
    else:
        common = [i for i, role in enumerate(roles) if role in (*FREQUENCIES, *SHARED)]
        values = [i for i, role in enumerate(roles) if role and i not in common]
        own = _by_repetition(meanings, values)
    found = []
    for group in own:
        said = _said_of_group(meanings, group)
        if len(own) > 1 and said == Said():
            over = [labels[i] for i in range(group[0], group[-1] + 1) if i in labels]
            over = over or [labels[i] for i in sorted(labels) if i <= group[0]][-1:]
            if over:
                said = Said(over[0][0], None if over[0][1] < 0 else over[0][1])
        found.append((sorted({*common, *group}), said))
    return found


def _by_frequency(roles: list[str], frequencies: list[int]) -> list[list[int]]:
    """Groups that each have their own frequency column."""
    named = [i for i, role in enumerate(roles) if role]
    start, stop = named[0], named[-1] + 1
    period = frequencies[1] - frequencies[0]
    periodic = (stop - start) <= period * len(frequencies) and all(
        roles[i] == roles[i - period] for i in range(start + period, stop)
    )
    if periodic:
        starts = list(range(start, stop, period))
    elif frequencies[0] == next(i for i in named if roles[i] not in SHARED):
        starts = frequencies
    else:
        starts = [start, *(i + 1 for i in frequencies[:-1])]
    return [[i for i in range(a, b) if roles[i]] for a, b in pairwise([*starts, len(roles)])]


def _by_repetition(meanings: list[Meaning | None], values: list[int]) -> list[list[int]]:
    """Groups that share a frequency column: by their labels, else anew where a role comes again."""
    kinds = [meanings[i] for i in values]
    known = [m for m in kinds if m is not None]
    if len({(m.role, m.logarithm) for m in known}) == len(known):
        return [values]
    keys = [(m.hours, m.label) for m in known]
    if all(key != (None, "") for key in keys):
        by_key: dict[tuple[float | None, str], list[int]] = {}
        for i, key in zip(values, keys, strict=True):
            by_key.setdefault(key, []).append(i)
        return list(by_key.values())
    groups: list[list[int]] = [[]]
    taken: set[str] = set()
    for i, what in zip(values, known, strict=True):
        if what.role in taken:
            groups.append([])
            taken = set()
        groups[-1].append(i)
        taken.add(what.role)
    return groups


def _said_of_group(meanings: list[Meaning | None], group: list[int]) -> Said:
    said = Said()
    for i in group:
        what = meanings[i]
        if what is not None and what.hours is not None and said.hours is None:
            said = replace(said, hours=what.hours)
        if what is not None and what.label and not said.panel:
            said = replace(said, panel=what.label)
    return said
