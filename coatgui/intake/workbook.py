"""Workbooks (`.xlsx`) as grids of cells, one a sheet. Values are read, formulas are not run."""

from __future__ import annotations

import io
import zipfile

from coatgui.intake.decode import Grid, Unreadable

_MOST_ROWS, _MOST_COLUMNS = 100_000, 200
_LARGEST_UNPACKED = 300_000_000


def sheets(data: bytes) -> list[tuple[str, Grid]]:
    """Name and cells of every sheet that holds something. Raises Unreadable."""
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            unpacked = sum(info.file_size for info in archive.infolist())
    except zipfile.BadZipFile:
        raise Unreadable("The workbook is damaged: save it again as .xlsx.") from None
    if unpacked > _LARGEST_UNPACKED:
        raise Unreadable("The workbook unpacks to more than 300 MB: split it.")
    import openpyxl

    try:
        book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=True)
    except Exception as error:  # the library raises many kinds for damaged files
        raise Unreadable(f"The workbook cannot be read ({type(error).__name__}).") from None
    result = []
    try:
        for sheet in book.worksheets:
            lines = []
            for number, row in enumerate(
                sheet.iter_rows(max_col=_MOST_COLUMNS, values_only=True), start=1
            ):
                if number > _MOST_ROWS:
                    raise Unreadable(f"Sheet '{sheet.title}' has over {_MOST_ROWS} rows: split it.")
                cells = [_text(value) for value in row]
                while cells and not cells[-1]:
                    cells.pop()
                lines.append(tuple(cells))
            if any(lines):
                result.append((sheet.title, Grid("xlsx", "cells", ".", tuple(lines))))
    finally:
        book.close()
    return result


def _text(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return str(value)
    if isinstance(value, int | float):
        return repr(float(value))
    return str(value).strip()
