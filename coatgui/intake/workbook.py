"""Workbooks (`.xlsx`): the cells of every sheet, read with a plain XML parser within fixed limits.

A workbook may come from anywhere: nothing in it is run, no entity is expanded, no link followed,
and a file that unpacks to far more than a table of spectra is refused before it is unpacked. Of a
formula, the value that was stored with it is read.
"""

from __future__ import annotations

import io
import math
import posixpath
import re
import zipfile
import zlib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from typing import Any
from xml.parsers import expat

from coatgui.intake.complex_cells import opened_sheet
from coatgui.intake.errors import Unclear, Unreadable
from coatgui.intake.numbers import Style, looks_numeric, style_of
from coatgui.intake.segments import MOST_COLUMNS, Cell

_MOST_CELLS = 300_000
_MOST_ROWS = 200_000
_MOST_SHEETS = 200
_LAST_ROW = 1_048_576
_MOST_UNPACKED = 40_000_000
_MOST_TEXT = 20_000_000
_CHUNK = 1 << 16
_MOST_IN_A_TAG = 2_000_000  # bytes, of a tag's attributes or of one text
_FEWEST_IN_COLUMN = 5
_DAMAGED = "The workbook is damaged or not of the kind .xlsx: save it again as .xlsx."
_TOO_LARGE = "The workbook holds over {} {}: split it, or export the tables as text."
# The built-in formats of dates and times (ECMA-376 part 1, 18.8.30).
_DATE_FORMATS = {*range(14, 23), *range(27, 37), *range(45, 48), *range(50, 59)}
_REFERENCE = re.compile(r"([A-Z]{1,3})(\d{1,7})")


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


def is_workbook(data: bytes) -> bool:
    """Whether the bytes are a ZIP archive, as a workbook is."""
    return data[:4] == b"PK\x03\x04"


def read_workbook(data: bytes) -> list[Sheet]:
    """Every sheet that holds something, in the order of the book. Raises Unreadable."""
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            return _Book(archive).sheets()
    except (zipfile.BadZipFile, KeyError, ValueError, OverflowError, EOFError, OSError):
        raise Unreadable(_DAMAGED) from None
    except (expat.ExpatError, NotImplementedError, RuntimeError, zlib.error):
        raise Unreadable(_DAMAGED) from None


class _Book:
    def __init__(self, archive: zipfile.ZipFile) -> None:
        self._archive = archive
        self._names = {info.filename for info in archive.infolist()}
        self._unpacked = 0
        self._cells = 0
        self._text = 0

    def sheets(self) -> list[Sheet]:
        root = "xl/workbook.xml"
        if root not in self._names:
            raise Unreadable(_DAMAGED)
        links = self._links("xl/_rels/workbook.xml.rels")
        listed, from_1904 = self._listed(root)
        if len(listed) > _MOST_SHEETS:
            raise Unreadable(_TOO_LARGE.format(_MOST_SHEETS, "sheets"))
        strings = self._strings()
        dates = self._date_styles()
        epoch = datetime(1904, 1, 1) if from_1904 else datetime(1899, 12, 30)
        result = []
        for title, link in listed:
            target = links.get(link)
            if target is None or target not in self._names:
                continue
            rows = _Rows(self, strings, dates, epoch)
            self.parse(target, rows.start, rows.end, rows.characters)
            if rows.rows:
                result.append(_with_style(Sheet(title, rows.rows)))
        return result

    def parse(
        self,
        name: str,
        start: Callable[[str, dict[str, str]], None],
        end: Callable[[str], None] | None = None,
        characters: Callable[[str], None] | None = None,
    ) -> None:
        """Send a part of the archive through a parser, counting what it unpacks to."""
        parser = expat.ParserCreate()
        parser.buffer_text = True

        def first(tag: str, attributes: dict[str, str]) -> None:
            """Some programs write every tag with a prefix; most do not, and are read faster."""
            if ":" in tag:
                parser.StartElementHandler = lambda tag, found: start(_local(tag), found)
                parser.EndElementHandler = None if end is None else lambda tag: end(_local(tag))
            else:
                parser.StartElementHandler = start
                parser.EndElementHandler = end
            start(_local(tag), attributes)

        parser.StartElementHandler = first
        if characters is not None:
            parser.CharacterDataHandler = characters
        parser.StartDoctypeDeclHandler = _no_doctype
        with self._archive.open(name) as stream:
            tagless = 0
            while chunk := stream.read(_CHUNK):
                self._unpacked += len(chunk)
                tagless = 0 if b"<" in chunk else tagless + len(chunk)
                if tagless > _MOST_IN_A_TAG:
                    megabytes = _MOST_IN_A_TAG // 1_000_000
                    raise Unreadable(_TOO_LARGE.format(megabytes, "MB in a single tag or text"))
                if self._unpacked > _MOST_UNPACKED:
                    raise Unreadable(_TOO_LARGE.format(_MOST_UNPACKED // 1_000_000, "MB unpacked"))
                parser.Parse(chunk, False)
            parser.Parse(b"", True)

    def count_cell(self) -> None:
        self._cells += 1
        if self._cells > _MOST_CELLS:
            raise Unreadable(_TOO_LARGE.format(f"{_MOST_CELLS:,}".replace(",", " "), "cells"))

    def count_text(self, text: str) -> None:
        self._text += len(text)
        if self._text > _MOST_TEXT:
            raise Unreadable(_TOO_LARGE.format(_MOST_TEXT // 1_000_000, "MB of text"))

    def _links(self, name: str) -> dict[str, str]:
        """Parts of this archive by the ids under which the book names them; links that lead out
        of it are left aside."""
        links: dict[str, str] = {}

        def start(tag: str, attributes: dict[str, str]) -> None:
            self.count_cell()
            if tag == "Relationship" and attributes.get("TargetMode") != "External":
                target = attributes.get("Target", "")
                path = target[1:] if target.startswith("/") else posixpath.join("xl", target)
                links[attributes.get("Id", "")] = posixpath.normpath(path)

        if name in self._names:
            self.parse(name, start)
        return links

    def _listed(self, name: str) -> tuple[list[tuple[str, str]], bool]:
        listed: list[tuple[str, str]] = []
        from_1904 = False

        def start(tag: str, attributes: dict[str, str]) -> None:
            nonlocal from_1904
            if tag == "sheet":
                link = next((v for k, v in attributes.items() if _local(k) == "id"), "")
                listed.append((attributes.get("name", ""), link))
            elif tag == "workbookPr":
                from_1904 = attributes.get("date1904") in ("1", "true")
            self.count_cell()

        self.parse(name, start)
        return listed, from_1904

    def _strings(self) -> list[str]:
        """The shared texts."""
        strings: list[str] = []
        parts: list[str] = []
        inside, phonetic = False, False

        def start(tag: str, _: dict[str, str]) -> None:
            nonlocal inside, phonetic
            if tag == "si":
                parts.clear()
            elif tag == "rPh":
                phonetic = True
            elif tag != "t":
                self.count_cell()
            inside = tag == "t" and not phonetic

        def end(tag: str) -> None:
            nonlocal inside, phonetic
            inside = False
            if tag == "rPh":
                phonetic = False
            elif tag == "si":
                strings.append("".join(parts))
                self.count_text(strings[-1])
                if len(strings) > _MOST_CELLS:
                    raise Unreadable(_TOO_LARGE.format(_MOST_CELLS, "texts"))

        def characters(text: str) -> None:
            if inside:
                parts.append(text)

        if "xl/sharedStrings.xml" in self._names:
            self.parse("xl/sharedStrings.xml", start, end, characters)
        return strings

    def _date_styles(self) -> set[int]:
        """Which cell styles show a number as a date or time."""
        formats: dict[int, str] = {}
        styles: list[int] = []
        inside = False

        def start(tag: str, attributes: dict[str, str]) -> None:
            nonlocal inside
            if tag == "numFmt":
                formats[int(attributes.get("numFmtId", "-1"))] = attributes.get("formatCode", "")
            elif tag == "cellXfs":
                inside = True
            self.count_cell()
            if tag == "xf" and inside:
                styles.append(int(attributes.get("numFmtId", "0")))

        def end(tag: str) -> None:
            nonlocal inside
            if tag == "cellXfs":
                inside = False

        if "xl/styles.xml" in self._names:
            self.parse("xl/styles.xml", start, end)
        return {
            i for i, f in enumerate(styles) if f in _DATE_FORMATS or _shows_date(formats.get(f))
        }


class _Rows:
    """The rows of one sheet while it is parsed."""

    def __init__(
        self, book: _Book, strings: Sequence[str], dates: set[int], epoch: datetime
    ) -> None:
        self.rows: list[tuple[int, list[Cell]]] = []
        self._book, self._strings, self._dates, self._epoch = book, strings, dates, epoch
        self._row = 0
        self._column = -1
        self._kind, self._style = "", 0
        self._value: list[str] = []
        self._inside = False

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        if tag == "c":
            self._book.count_cell()
            found = _REFERENCE.fullmatch(attributes.get("r", ""))
            self._column = _column(found[1]) if found else self._column + 1
            self._kind = attributes.get("t", "n")
            self._style = int(attributes.get("s", "0"))
            self._value = []
        elif tag in ("v", "t"):
            self._inside = True
        elif tag == "row":
            self._book.count_cell()
            given = int(attributes.get("r", self._row + 1))
            if given > _LAST_ROW:
                raise Unreadable(_DAMAGED)
            self._row = given if given > self._row else self._row + 1
            self._column = -1
        elif tag not in ("is", "f"):
            self._book.count_cell()  # whatever it is, not without end

    def characters(self, text: str) -> None:
        if self._inside:
            self._value.append(text)

    def end(self, tag: str) -> None:
        if tag in ("v", "t"):
            self._inside = False
        elif tag == "c" and self._value:
            self._keep(self._cell("".join(self._value)))

    def _keep(self, cell: Cell) -> None:
        if cell == "":
            return
        if self._column >= MOST_COLUMNS:
            raise Unreadable(_TOO_LARGE.format(MOST_COLUMNS, "columns"))
        if not self.rows or self.rows[-1][0] != self._row:
            if len(self.rows) >= _MOST_ROWS:
                raise Unreadable(_TOO_LARGE.format(_MOST_ROWS, "rows"))
            self.rows.append((self._row, []))
        cells = self.rows[-1][1]
        if len(cells) > self._column:
            cells[self._column] = cell
            return
        empty = self._column - len(cells)
        cells += [""] * empty
        cells.append(cell)

    def _cell(self, value: str) -> Cell:
        if self._kind == "s":
            place = int(value)
            return self._strings[place].strip() if 0 <= place < len(self._strings) else ""
        if self._kind in ("str", "inlineStr"):
            self._book.count_text(value)
            return value.strip()
        if self._kind == "b":
            return "true" if value == "1" else "false"
        if self._kind == "e":
            return value.strip()
        if self._kind == "d":
            return value.strip()
        number = float(value)
        if self._style in self._dates and math.isfinite(number) and 0 <= number < 2_958_466:
            moment = self._epoch + timedelta(days=number)
            return (moment + timedelta(microseconds=500_000)).replace(microsecond=0).isoformat(" ")
        return number


def _with_style(sheet: Sheet) -> Sheet:
    """Numbers that are kept as text, with a decimal comma perhaps, or complex."""
    sheet.rows, sheet.pairs = opened_sheet(sheet.rows)
    texts = [c for _, cells in sheet.rows for c in cells if isinstance(c, str) and looks_numeric(c)]
    try:
        sheet.style = style_of(texts) or Style()
    except Unclear:
        sheet.style = Style()
    return sheet


def _shows_date(code: str | None) -> bool:
    if not code:
        return False
    plain = re.sub(r'"[^"]*"|\\.|\[[^\]]*\]', "", code).casefold()
    return any(letter in plain for letter in "ydhs") and "0.00e" not in plain


def _column(letters: str) -> int:
    place = 0
    for letter in letters:
        place = place * 26 + ord(letter) - 64
    return place - 1


def _local(tag: str) -> str:
    return tag.rpartition(":")[2]


def _no_doctype(*_: Any) -> None:
    raise Unreadable("The workbook holds a document type, which no workbook needs: not read.")
