"""The spectra in the bytes of one file, whatever they are: text or workbook, by content."""

from __future__ import annotations

import codecs
import re
from collections.abc import Iterator
from dataclasses import replace
from itertools import islice

from coatgui.intake.cut import NOTHING, find_cut
from coatgui.intake.decode import encoding_of, lines_of
from coatgui.intake.errors import NoSpectrum, Unreadable
from coatgui.intake.labels import label_in
from coatgui.intake.layout import Section, sections_of
from coatgui.intake.segments import segment_rows
from coatgui.intake.spectra import Origin, Piece, pieces, pieces_as_told, with_parts
from coatgui.intake.text_rows import segment_text
from coatgui.intake.workbook import Sheet, is_workbook, read_workbook
from coatgui.records import Column, Dialect, FoundReading, Source

_SAMPLE_LINES = 400
_SAMPLE_CHARACTERS = 400_000
WORKBOOK = "xlsx"
# The names that programs give to sheets by themselves.
_ANY_SHEET = re.compile(
    r"(sheet|tabelle|blatt|feuil|feuille|hoja|folha|planilha|plan|foglio|data|daten)\s*\d*",
    re.IGNORECASE,
)


def read_spectra(data: bytes, name: str = "") -> list[Piece]:
    """All spectra in the bytes of one file. Raises Unreadable, or Unclear where a person must say
    something, with one sentence. The name is not looked at."""
    if is_workbook(data):
        return _of_workbook(data)
    encoding = encoding_of(data)
    cut = find_cut(_sample(lines_of(data, encoding)))
    sections, after = sections_of(segment_text(lines_of(data, encoding), cut), cut.pairs)
    if not sections:
        raise NoSpectrum(NOTHING)
    origin = Origin(encoding, cut.delimiter, cut.style.decimal_sign)
    return pieces(sections, after, origin)


def _sample(lines: Iterator[str]) -> list[str]:
    """The first lines, by which the cut is chosen."""
    result = []
    characters = 0
    for line in islice(lines, _SAMPLE_LINES):
        characters += len(line)
        if characters > _SAMPLE_CHARACTERS:
            break
        result.append(line)
    return result


def _of_workbook(data: bytes) -> list[Piece]:
    """Tables may stand anywhere on any sheet. A sheet without one is passed over, as long as
    another has one."""
    sheets = read_workbook(data)
    found: list[Piece] = []
    passed_over: list[str] = []
    nothing: NoSpectrum | None = None
    for sheet in sheets:
        try:
            of_sheet = _of_sheet(sheet)
        except NoSpectrum as problem:
            if sheet.holds_numbers:
                nothing = nothing or problem
                passed_over.append(f"Sheet '{sheet.title[:40]}' holds no spectrum.")
            continue
        except Unreadable as problem:
            raise type(problem)(f"Sheet '{sheet.title[:40]}': {problem}") from None
        for piece in of_sheet:
            piece = _named_by_sheet(piece, sheet.title)
            part = f"{sheet.title}, {piece.part}".strip(", ") if len(sheets) > 1 else piece.part
            found.append(replace(piece, part=part))
    if not found:
        raise nothing or NoSpectrum("The workbook holds no table of numbers: nothing to read.")
    return [
        replace(p, dialect=replace(p.dialect, remarks=(*p.dialect.remarks, *passed_over)))
        for p in found
    ]


def _named_by_sheet(piece: Piece, title: str) -> Piece:
    """Panel and exposure time from the sheet's name, where its cells do not say."""
    panel, hours = label_in(title)
    if hours is None and (piece.exposure_h is None or _ANY_SHEET.fullmatch(panel)):
        return piece
    return replace(
        piece,
        panel=piece.panel or panel,
        exposure_h=hours if piece.exposure_h is None else piece.exposure_h,
        named_by_column=piece.named_by_column and bool(piece.panel),
    )


def _of_sheet(sheet: Sheet) -> list[Piece]:
    found: list[Piece] = []
    origin = Origin(WORKBOOK, sheet.title, sheet.style.decimal_sign)
    nothing = NoSpectrum(NOTHING)
    for rows in sheet.tables():
        sections, after = sections_of(segment_rows(rows, sheet.style), sheet.pairs)
        try:
            found += pieces(sections, after, origin)
        except NoSpectrum as problem:
            nothing = problem
    if not found:
        raise nothing
    return with_parts(found)


def read_again(
    data: bytes, source: Source, dialect: Dialect, panel: str, exposure_h: float
) -> FoundReading:
    """One spectrum of stored bytes, as `read_as_told` reads it, for the reading it belongs to.
    Raises Unreadable."""
    piece = read_as_told(data, dialect)[0]
    return FoundReading(
        piece.spectrum,
        replace(source, dialect=piece.dialect),
        panel,
        exposure_h,
        temperature_span_c=piece.temperature_span_c,
        potential_span_mv=piece.potential_span_mv,
    )


def read_as_told(data: bytes, dialect: Dialect, part: str = "") -> list[Piece]:
    """Bytes read as a dialect says: encoding, delimiter (the sheet's name in a workbook), decimal
    sign, the line of the spectrum's first point (0 for every table), and roles, units and factors
    of the columns, signs included, all taken at their word. Raises Unreadable."""
    found: list[Piece] = []
    for sections in _sections_as_told(data, dialect):
        found += pieces_as_told(sections, dialect)
    if not found:
        raise Unreadable(
            f"No spectrum begins in line {dialect.first_data_line}: say in which line its first "
            "point stands."
            if dialect.first_data_line
            else NOTHING
        )
    remarks = (*(r for r in dialect.remarks if r != _BY_HAND), _BY_HAND)
    found = [replace(p, dialect=replace(p.dialect, remarks=remarks)) for p in found]
    return [replace(p, part=part) for p in found] if part else with_parts(found)


_BY_HAND = "The dialect was corrected by hand."


def _sections_as_told(data: bytes, dialect: Dialect) -> Iterator[list[Section]]:
    if is_workbook(data):
        sheet = next((s for s in read_workbook(data) if s.title == dialect.delimiter), None)
        if sheet is None:
            raise Unreadable(f"The workbook has no sheet '{dialect.delimiter[:40]}'.")
        for rows in sheet.tables():
            yield sections_of(segment_rows(rows, sheet.style), sheet.pairs)[0]
        return
    try:
        codecs.lookup(dialect.encoding)
        cut = find_cut(
            _sample(lines_of(data, dialect.encoding)), dialect.delimiter, dialect.decimal_sign
        )
        yield sections_of(segment_text(lines_of(data, dialect.encoding), cut), cut.pairs)[0]
    except (LookupError, UnicodeError):
        raise Unreadable(
            f"The file cannot be read as '{dialect.encoding[:20]}': choose another encoding."
        ) from None


def first_guess(data: bytes, decimal_sign: str = "") -> Dialect:
    """How the first table of a file would be cut, for a person to say what its columns are where
    that is not understood: line 0 for every table, "other" for a column of unknown meaning. Raises
    Unreadable where there is no table of numbers."""
    if is_workbook(data):
        sheets = ((s, tables) for s in read_workbook(data) for tables in [list(s.tables())])
        sheet, tables = next(((s, t) for s, t in sheets if t), (None, []))
        if sheet is None:
            raise NoSpectrum(NOTHING)
        encoding, delimiter, sign = WORKBOOK, sheet.title, sheet.style.decimal_sign
        sections = sections_of(segment_rows(tables[0], sheet.style), sheet.pairs)[0]
    else:
        encoding = encoding_of(data)
        cut = find_cut(_sample(lines_of(data, encoding)), "", decimal_sign)
        delimiter, sign = cut.delimiter, cut.style.decimal_sign
        sections = sections_of(segment_text(lines_of(data, encoding), cut), cut.pairs)[0]
    if not sections:
        raise NoSpectrum(NOTHING)
    section = sections[0]
    columns = []
    for place in range(section.block.width):
        heading = section.headings[place] if place < len(section.headings) else ""
        said = section.meanings[place] if place < len(section.meanings) else None
        if said is None:
            columns.append(Column(place, heading, "other", ""))
            continue
        role = f"log_{said.role}" if said.logarithm else said.role
        factor = said.unit.factor if said.unit is not None else 1.0
        written = said.unit.written if said.unit is not None else ""
        columns.append(Column(place, heading, role, written, -factor if said.negative else factor))
    return Dialect(encoding, delimiter, sign, 0, tuple(columns))
