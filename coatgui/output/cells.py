"""Writing cells safely: text from outside is never a formula, numbers that are not finite are left
empty, and the file's bytes depend on its content alone."""

from __future__ import annotations

import io
import math
import re
import zipfile
from collections.abc import Sequence
from datetime import datetime
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from openpyxl.workbook import Workbook
    from openpyxl.worksheet.worksheet import Worksheet

Value = str | int | float | None

_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff\ud800-\udfff]")
_LONGEST_TEXT = 32_000
_WIDEST, _NARROWEST = 60, 9
_FIXED_TIME = (1980, 1, 1, 0, 0, 0)


def clean(text: str) -> str:
    """Text without the characters a workbook cannot hold, at most as long as a cell allows."""
    return _CONTROL.sub("\ufffd", text)[:_LONGEST_TEXT]


def add_sheet(
    book: Workbook,
    title: str,
    headings: Sequence[str],
    rows: Sequence[Sequence[Value]],
    *,
    formats: dict[str, str] | None = None,
    colours: dict[str, str] | None = None,
) -> Worksheet:
    """A sheet with a frozen, filtered heading row. `formats` gives number formats by heading;
    `colours` fills cells whose text is a key (the text stands there too, so nothing depends on
    colour)."""
    from openpyxl.styles import Alignment, Font, PatternFill
    from openpyxl.utils import get_column_letter

    sheet: Worksheet = book.create_sheet(title)
    for column, heading in enumerate(headings, start=1):
        head = sheet.cell(1, column, heading)
        head.font = Font(bold=True)
        head.alignment = Alignment(wrap_text=True, vertical="top")
    widths = [len(heading) for heading in headings]
    for row, values in enumerate(rows, start=2):
        for column, value in enumerate(values, start=1):
            if value is None or (isinstance(value, float) and not math.isfinite(value)):
                continue
            cell = sheet.cell(row, column)
            if isinstance(value, str):
                text = clean(value)
                cell.value = text
                cell.data_type = "s"
                widths[column - 1] = max(widths[column - 1], len(text))
                colour = (colours or {}).get(text)
                if colour:
                    cell.fill = PatternFill("solid", fgColor=colour)
                if len(text) > _WIDEST:
                    cell.alignment = Alignment(wrap_text=True, vertical="top")
            else:
                cell.value = float(value) if isinstance(value, float) else value
                number_format = (formats or {}).get(headings[column - 1])
                if number_format:
                    cell.number_format = number_format
    for column, width in enumerate(widths, start=1):
        letter = get_column_letter(column)
        sheet.column_dimensions[letter].width = min(max(width + 2, _NARROWEST), _WIDEST)
    sheet.freeze_panes = "A2"
    if headings:
        sheet.auto_filter.ref = f"A1:{get_column_letter(len(headings))}{len(rows) + 1}"
    return sheet


def workbook_bytes(book: Workbook) -> bytes:
    """The workbook as bytes that depend on nothing but its content: no clock enters the file."""
    moment = datetime(2000, 1, 1)
    book.properties.created = moment
    raw = io.BytesIO()
    book.save(raw)
    result = io.BytesIO()
    with (
        zipfile.ZipFile(raw) as source,
        zipfile.ZipFile(result, "w", zipfile.ZIP_DEFLATED) as target,
    ):
        for item in source.infolist():
            content = source.read(item.filename)
            if item.filename == "docProps/core.xml":
                content = re.sub(
                    rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>2000-01-01T00:00:00Z", content
                )
            info = zipfile.ZipInfo(item.filename, _FIXED_TIME)
            info.compress_type = zipfile.ZIP_DEFLATED
            target.writestr(info, content)
    return result.getvalue()
