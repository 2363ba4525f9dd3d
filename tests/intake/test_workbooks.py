"""Workbooks: tables anywhere, cached values, dates; and workbooks made to do harm."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable
from contextlib import suppress
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest

from coatgui.intake import Unclear, Unreadable, read_files, read_spectra
from coatgui.intake.reading import read_as_told
from coatgui.records import ComplexArray

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY
Z = 120 + 1 / (2e-9 * S**0.95 + 1 / (4e6 + 1 / (3e-7 * S**0.85)))


def put(sheet: Any, row: int, column: int, headings: list[str], z: ComplexArray = Z) -> None:
    for i, heading in enumerate(headings):
        sheet.cell(row, column + i, heading)
    for r, (f, value) in enumerate(zip(FREQUENCY.tolist(), z.tolist(), strict=True), start=1):
        for i, number in enumerate((f, value.real, value.imag)):
            sheet.cell(row + r, column + i, number)


def book(fill: Callable[[Any], None]) -> bytes:
    made = openpyxl.Workbook()
    fill(made)
    buffer = io.BytesIO()
    made.save(buffer)
    return buffer.getvalue()


HEADS = ["f (Hz)", "Z' (Ohm)", "Z'' (Ohm)"]


def test_a_table_anywhere_with_prose_and_units_row() -> None:
    def fill(made: Any) -> None:
        sheet = made.active
        sheet["A1"] = "Measured on the second bench"
        sheet["A2"] = "Panel"
        sheet["B2"] = "A1"
        sheet["A3"] = "Exposure (h)"
        sheet["B3"] = 24
        put(sheet, 8, 5, ["Frequenz", "Realteil", "Imaginärteil"], Z / 1e3)
        sheet.insert_rows(9)
        for i, unit in enumerate(("Hz", "kOhm", "kOhm")):
            sheet.cell(9, 5 + i, unit)
        sheet.cell(40, 1, "End of the measurement")

    (piece,) = read_spectra(book(fill))
    assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-12)
    assert piece.dialect.first_data_line == 10
    assert (piece.panel, piece.exposure_h) == ("A1", 24.0)


def test_tables_side_by_side_that_begin_in_different_rows() -> None:
    def fill(made: Any) -> None:
        sheet = made.active
        sheet["A1"] = "A1 24 h"
        put(sheet, 2, 1, HEADS)
        sheet["F6"] = "A1 168 h"
        put(sheet, 7, 6, HEADS, 2 * Z)

    found = read_spectra(book(fill))
    assert [len(p.spectrum) for p in found] == [29, 29]
    assert np.allclose(found[1].spectrum.impedance_ohm, 2 * Z, rtol=1e-12)


def test_tables_side_by_side_in_the_same_rows() -> None:
    def fill(made: Any) -> None:
        sheet = made.active
        sheet["A1"], sheet["E1"] = "24 h", "168 h"
        put(sheet, 2, 1, HEADS)
        put(sheet, 2, 5, HEADS, 2 * Z)

    found = read_spectra(book(fill))
    assert [p.exposure_h for p in found] == [24.0, 168.0]
    assert np.allclose(found[1].spectrum.impedance_ohm, 2 * Z, rtol=1e-12)


def test_many_sheets_of_which_one_is_prose(tmp_path: Path) -> None:
    def fill(made: Any) -> None:
        made.active["A1"] = "Notes"
        for hours in (24, 168):
            sheet = made.create_sheet(f"A1 {hours} h")
            put(sheet, 1, 1, HEADS, Z * hours)

    path = tmp_path / "series.xlsx"
    path.write_bytes(book(fill))
    found = read_files([path])
    assert [(r.panel, r.exposure_h, r.source.part) for r in found.readings] == [
        ("A1", 24.0, "A1 24 h"), ("A1", 168.0, "A1 168 h")
    ]  # fmt: skip


def test_a_formula_gives_the_value_stored_with_it_and_is_not_run() -> None:
    def fill(made: Any) -> None:
        put(made.active, 1, 1, HEADS)
        made.active["B5"] = "=B4*2"  # no value is stored with it

    data = book(fill)
    with pytest.raises(Unreadable, match="Line 5 lacks a number in column 2"):
        read_spectra(data)
    cached = changed(data, "xl/worksheets/sheet1.xml", b"<f>B4*2</f><v />", b"<f>B4*2</f><v>7</v>")
    (piece,) = read_spectra(cached)
    assert piece.spectrum.impedance_ohm[3].real == 7.0


def test_dates_are_dates() -> None:
    def fill(made: Any) -> None:
        made.active["A1"], made.active["B1"] = "Date", datetime(2026, 3, 8, 10, 30)
        put(made.active, 3, 1, HEADS)

    (piece,) = read_spectra(book(fill))
    assert piece.moment == datetime(2026, 3, 8, 10, 30)


def test_numbers_kept_as_text_with_a_decimal_comma() -> None:
    def fill(made: Any) -> None:
        sheet = made.active
        for i, heading in enumerate(HEADS):
            sheet.cell(1, 1 + i, heading)
        for r, (f, z) in enumerate(zip(FREQUENCY.tolist(), Z.tolist(), strict=True), start=2):
            for i, number in enumerate((f, z.real, z.imag)):
                sheet.cell(r, 1 + i, repr(number).replace(".", ","))

    (piece,) = read_spectra(book(fill))
    assert np.allclose(piece.spectrum.impedance_ohm, Z, rtol=1e-12)
    assert piece.dialect.decimal_sign == ","


def test_a_sheet_is_read_again_from_its_dialect() -> None:
    def fill(made: Any) -> None:
        put(made.create_sheet("Second"), 4, 2, HEADS)

    (piece,) = read_spectra(book(fill))
    assert (piece.dialect.encoding, piece.dialect.delimiter) == ("xlsx", "Second")
    (again,) = read_as_told(book(fill), piece.dialect)
    assert again.spectrum == piece.spectrum


def test_a_sheet_with_a_broken_spectrum_names_itself() -> None:
    def fill(made: Any) -> None:
        put(made.active, 1, 1, HEADS)
        made.active["B9"] = 0
        made.active["C9"] = 0

    with pytest.raises(Unreadable, match="Sheet 'Sheet': Line 9: the impedance is zero"):
        read_spectra(book(fill))
    with pytest.raises(Unclear, match="furlong"):
        read_spectra(book(lambda made: put(made.active, 1, 1, ["f (Hz)", "Z' (furlong)", "Z''"])))


# ---------------------------------------------------------------------------------------------
# Workbooks made to do harm


def changed(data: bytes, name: str, old: bytes, new: bytes) -> bytes:
    buffer = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as source, zipfile.ZipFile(buffer, "w") as target:
        for info in source.infolist():
            content = source.read(info)
            if info.filename == name:
                assert old in content
                content = content.replace(old, new)
            target.writestr(info, content, zipfile.ZIP_DEFLATED)
    return buffer.getvalue()


SHEET = "xl/worksheets/sheet1.xml"
_MEGABYTE = 1_000_000


@pytest.fixture(scope="module")
def plain() -> bytes:
    return book(lambda made: put(made.active, 1, 1, HEADS))


def test_a_compressed_bomb_is_refused_early(plain: bytes) -> None:
    bomb = changed(plain, SHEET, b"</sheetData>", b"</sheetData>" + b" " * 100_000_000)
    assert len(bomb) < 200_000
    with pytest.raises(Unreadable, match="2 MB in a single tag"):
        read_spectra(bomb)
    tags = changed(plain, SHEET, b"</sheetData>", b"</sheetData>" + b"<f></f>" * 10_000_000)
    with pytest.raises(Unreadable, match="40 MB unpacked"):
        read_spectra(tags)
    one = changed(plain, SHEET, b"<sheetData", b"<sheetData " + b'a="1" ' * 10 * _MEGABYTE)
    with pytest.raises(Unreadable, match="2 MB in a single tag"):
        read_spectra(one)


def test_entities_are_not_expanded(plain: bytes) -> None:
    doctype = (
        b'<!DOCTYPE x [<!ENTITY a "aaaaaaaaaa"><!ENTITY b "&a;&a;&a;&a;&a;&a;&a;&a;">'
        b'<!ENTITY c SYSTEM "file:///etc/hostname">]>'
    )
    for part, root in ((SHEET, b"<worksheet"), ("xl/workbook.xml", b"<workbook")):
        with pytest.raises(Unreadable, match="document type"):
            read_spectra(changed(plain, part, root, doctype + root))


def test_too_many_cells_columns_and_rows_are_refused(plain: bytes) -> None:
    many = b"".join(
        b'<row r="%d">%s</row>' % (r, b"<c><v>1</v></c>" * 100) for r in range(99, 3200)
    )
    with pytest.raises(Unreadable, match="300 000 cells"):
        read_spectra(changed(plain, SHEET, b"</sheetData>", many + b"</sheetData>"))
    far = b'<row r="1048576"><c r="XFD1048576"><v>1</v></c></row>'
    with pytest.raises(Unreadable, match="256 columns"):
        read_spectra(changed(plain, SHEET, b"</sheetData>", far + b"</sheetData>"))
    # A cell far down costs nothing: rows that hold nothing are not made.
    deep = b'<row r="1048576"><c r="A1048576"><v>1</v></c></row>'
    (piece,) = read_spectra(changed(plain, SHEET, b"</sheetData>", deep + b"</sheetData>"))
    assert len(piece.spectrum) == 29


def test_links_that_lead_out_are_left_aside(plain: bytes) -> None:
    target = b'Target="/xl/worksheets/sheet1.xml"'
    out = changed(plain, "xl/_rels/workbook.xml.rels", target,
                  b'Target="../../../etc/hostname" TargetMode="External"')  # fmt: skip
    with pytest.raises(Unreadable, match="no table"):
        read_spectra(out)
    up = changed(plain, "xl/_rels/workbook.xml.rels", target, b'Target="../../../etc/hostname"')
    with pytest.raises(Unreadable, match="no table"):
        read_spectra(up)


def test_nonsense_in_the_parts(plain: bytes) -> None:
    for part, old, new in (
        (SHEET, b"<v>", b"<v>x"),
        (SHEET, b"<sheetData>", b"<sheetData"),
        (SHEET, b't="n"', b't="s"'),
        (SHEET, b'r="1"', b'r="one"'),
        (SHEET, b'r="1"', b'r="99999999999999999999999"'),
        ("xl/styles.xml", b'numFmtId="0"', b'numFmtId="zero"'),
        ("xl/workbook.xml", b"sheetId", b"sheetid"),
    ):
        # Read or refused, but never anything else.
        with suppress(Unreadable):
            read_spectra(changed(plain, part, old, new))


def test_tags_with_a_prefix(plain: bytes) -> None:
    prefixed = plain
    for old, new in ((b"<", b"<x:"), (b"<x:/", b"</x:"), (b"<x:?", b"<?"),
                     (b"<x:worksheet xmlns=", b"<x:worksheet xmlns:x=")):  # fmt: skip
        prefixed = changed(prefixed, SHEET, old, new) if old != b"<x:?" else prefixed
    (piece,) = read_spectra(prefixed)
    assert len(piece.spectrum) == 29


def test_an_archive_that_is_no_workbook() -> None:
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as archive:
        archive.writestr("readme.txt", "hello")
    with pytest.raises(Unreadable, match="damaged or not of the kind"):
        read_spectra(buffer.getvalue())
    with pytest.raises(Unreadable, match="damaged or not of the kind"):
        read_spectra(b"PK\x03\x04" + bytes(100))
