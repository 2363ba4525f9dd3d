"""Writing sheets safely: text from outside is never a formula, numbers that are not finite are left
empty, and the file's bytes depend on its content alone."""

from __future__ import annotations

import io
import math
import re
import zipfile
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import TYPE_CHECKING, Generic, TypeVar

if TYPE_CHECKING:
    from openpyxl.workbook import Workbook

Value = str | int | float | None
Row = TypeVar("Row")

_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff\ud800-\udfff]")
_LIKE_A_FORMULA = ("=", "+", "-", "@", "\t", "\r")
_LONGEST_TEXT = 32_000
_WIDEST, _NARROWEST = 60, 9
_WIDEST_HEADING = 18
_FIXED_TIME = (1980, 1, 1, 0, 0, 0)


@dataclass(frozen=True, slots=True)
class Column(Generic[Row]):
    """A column of a sheet: its heading, how its value comes out of a row, its number format."""

    heading: str
    value: Callable[[Row], Value]
    number_format: str = "General"


def clean(text: str) -> str:
    """Text without the characters a workbook cannot hold, at most as long as a cell allows."""
    return _CONTROL.sub("\ufffd", text)[:_LONGEST_TEXT]


def add_sheet(
    book: Workbook,
    title: str,
    columns: Sequence[Column[Row]],
    rows: Iterable[Row],
    *,
    colours: dict[str, str] | None = None,
    standing: int = 0,
) -> None:
    """A sheet with a frozen, filtered heading row that is printed on every page. `colours` fills
    cells whose text is a key (the text stands there too, so nothing depends on colour); the first
    `standing` columns stay in sight."""
    from openpyxl.styles import Alignment, Font, PatternFill
    from openpyxl.utils import get_column_letter

    bold, top = Font(bold=True), Alignment(wrap_text=True, vertical="top")
    fills = {text: PatternFill("solid", fgColor=c) for text, c in (colours or {}).items()}
    sheet = book.create_sheet(title)
    for place, column in enumerate(columns, start=1):
        head = sheet.cell(1, place, column.heading)
        head.font, head.alignment = bold, top
    widths = [min(len(column.heading), _WIDEST_HEADING) for column in columns]
    last = 1
    for last, row in enumerate(rows, start=2):
        for place, column in enumerate(columns, start=1):
            value = column.value(row)
            if value in (None, "") or (isinstance(value, float) and not math.isfinite(value)):
                continue
            cell = sheet.cell(last, place)
            if not isinstance(value, str):
                cell.value = value
                cell.number_format = column.number_format
                continue
            text = clean(value)
            cell.value = text
            cell.data_type = "s"
            if text in fills:
                cell.fill = fills[text]
            if len(text) > _WIDEST:
                cell.alignment = top
            if text.startswith(_LIKE_A_FORMULA):
                cell.quotePrefix = True  # stays text when someone edits the cell
            widths[place - 1] = max(widths[place - 1], len(text))
    for place, width in enumerate(widths, start=1):
        letter = get_column_letter(place)
        sheet.column_dimensions[letter].width = min(max(width + 2, _NARROWEST), _WIDEST)
    sheet.freeze_panes = f"{get_column_letter(standing + 1)}2"
    sheet.auto_filter.ref = f"A1:{get_column_letter(len(columns))}{last}"
    sheet.print_title_rows = "1:1"
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.fitToHeight = 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True


def workbook_bytes(book: Workbook) -> bytes:
    """The workbook as bytes that depend on nothing but its content: no clock enters the file."""
    book.properties.created = datetime(2000, 1, 1)
    raw, result = io.BytesIO(), io.BytesIO()
    book.save(raw)
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
