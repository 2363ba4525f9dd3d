"""Writing sheets safely and fast: text from outside is never a formula, numbers that are not finite
are left empty, formulas come with their values, and the file's bytes depend on its content alone.

openpyxl keeps the book together: sheets, styles, names, charts. The rows are written here and put
into its sheets when it is saved: that takes a fraction of the time and memory, and openpyxl cannot
write a formula together with its value.
"""

from __future__ import annotations

import io
import math
import re
import tempfile
import zipfile
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import TYPE_CHECKING, Any, Generic, TypeVar

if TYPE_CHECKING:
    from openpyxl.worksheet.worksheet import Worksheet

Row = TypeVar("Row")

_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff\ud800-\udfff]")
# Spreadsheets read _x0041_ as a letter written by its number.
_NUMBERED = re.compile(r"_(?=x[0-9A-Fa-f]{4}_)")
_LIKE_A_FORMULA = ("=", "+", "-", "@", "\t", "\r")
_LONGEST_TEXT = 32_000
_WIDEST, _NARROWEST = 60, 9
_WIDEST_HEADING = 18
_LINE, _DEEPEST = 15.0, 27  # points; rows are at most 409 points high
_IN_MEMORY, _BLOCK = 1_000_000, 1_000_000  # bytes
_FIXED_TIME = (1980, 1, 1, 0, 0, 0)
_ROWS = re.compile(rb"<sheetData ?/>|<sheetData>.*?</sheetData>", re.DOTALL)


@dataclass(frozen=True, slots=True)
class Formula:
    """A formula of the program's own, never from outside, with the value it has now. `{r}` stands
    for the number of its row."""

    text: str
    value: str | float | None


Value = str | int | float | None | Formula


@dataclass(frozen=True, slots=True)
class Column(Generic[Row]):
    """A column of a sheet: its heading, how its value comes out of a row, its number format.
    `to_edit` marks the cells that a reader may change to see what follows."""

    heading: str
    value: Callable[[Row], Value]
    number_format: str = "General"
    to_edit: bool = False


def clean(text: str) -> str:
    """Text without the characters a workbook cannot hold, at most as long as a cell allows."""
    return _CONTROL.sub("\ufffd", text)[:_LONGEST_TEXT]


def letter(place: int) -> str:
    """The name of a column, counted from 0."""
    name = ""
    place += 1
    while place:
        place, rest = divmod(place - 1, 26)
        name = chr(65 + rest) + name
    return name


class Book:
    """A workbook in the making."""

    def __init__(self) -> None:
        from openpyxl import Workbook

        self.workbook = Workbook()
        self.workbook.remove(self.workbook.worksheets[0])
        # The rows of large campaigns would fill the memory: they wait in a file.
        self._rows: dict[str, tempfile.SpooledTemporaryFile[bytes]] = {}
        self._size: dict[str, tuple[int, int]] = {}
        self._styles: dict[tuple[str, bool, str, bool, bool], str] = {}

    def add_sheet(
        self,
        title: str,
        columns: Sequence[Column[Row]],
        rows: Iterable[Row],
        *,
        colours: Mapping[str, str] | None = None,
        standing: int = 0,
    ) -> Worksheet:
        """A sheet with a frozen, filtered heading row that is printed on every page. `colours`
        fills cells whose text is a key (the text stands there too, so nothing depends on colour);
        the first `standing` columns stay in sight."""
        sheet: Worksheet = self.workbook.create_sheet(title)
        colours = colours or {}
        letters = [letter(i) for i in range(len(columns))]
        head = self._style("General", wrap=True, bold=True)
        lines = tempfile.SpooledTemporaryFile(_IN_MEMORY)  # noqa: SIM115 - closed with the book
        heading = "".join(
            _text(f"{name}1", head, column.heading)
            for name, column in zip(letters, columns, strict=True)
        )
        high = _LINE * _lines_of_heading(columns)
        lines.write(f'<row r="1" ht="{high:g}" customHeight="1">{heading}</row>'.encode())
        widths = [min(len(column.heading), _WIDEST_HEADING) for column in columns]
        numbered = [
            self._style(column.number_format, fill="FFF8DC" if column.to_edit else "")
            for column in columns
        ]
        last = 1
        for last, row in enumerate(rows, start=2):
            cells: list[str] = []
            deep = 1
            for place, column in enumerate(columns):
                value = column.value(row)
                at = f"{letters[place]}{last}"
                if isinstance(value, str):
                    if not value:
                        continue
                    text = clean(value)
                    widths[place] = max(widths[place], len(text))
                    # Without a height of its own a row hides all but the first line of a text.
                    if len(text) > _WIDEST:
                        deep = max(deep, min(math.ceil(len(text) / (_WIDEST - 8)), _DEEPEST))
                    style = self._style(
                        "General",
                        wrap=len(text) > _WIDEST,
                        fill=colours.get(text, ""),
                        quoted=text.startswith(_LIKE_A_FORMULA),
                    )
                    cells.append(_text(at, style, text))
                elif isinstance(value, Formula):
                    fill = colours.get(value.value, "") if isinstance(value.value, str) else ""
                    style = (
                        self._style(column.number_format, fill=fill) if fill else numbered[place]
                    )
                    cells.append(_formula(at, style, value, last))
                elif value is not None and math.isfinite(value):
                    cells.append(f'<c r="{at}" s="{numbered[place]}"><v>{value!r}</v></c>')
                elif column.to_edit:
                    cells.append(f'<c r="{at}" s="{numbered[place]}"/>')
            own = f' ht="{_LINE * deep:g}" customHeight="1"' if deep > 1 else ""
            lines.write(f'<row r="{last}"{own}>{"".join(cells)}</row>'.encode())
        self._rows[title] = lines
        self._size[title] = (last, len(columns))
        for name, width in zip(letters, widths, strict=True):
            sheet.column_dimensions[name].width = min(max(width + 2, _NARROWEST), _WIDEST)
        whole = f"A1:{letters[-1]}{last}"
        sheet.freeze_panes = f"{letter(standing)}2"
        sheet.auto_filter.ref = whole
        sheet.print_area = whole
        sheet.print_title_rows = "1:1"
        _for_print(sheet)
        return sheet

    def add_page(self, title: str) -> Worksheet:
        """A sheet for charts, without rows."""
        sheet: Worksheet = self.workbook.create_sheet(title)
        _for_print(sheet)
        return sheet

    def name(self, name: str, title: str, cell: str) -> None:
        """Give a cell a name that formulas can use."""
        from openpyxl.workbook.defined_name import DefinedName

        column, row = re.fullmatch(r"([A-Z]+)(\d+)", cell).groups()  # type: ignore[union-attr]
        reference = f"'{title}'!${column}${row}"
        self.workbook.defined_names[name] = DefinedName(name, attr_text=reference)

    def _style(
        self,
        number_format: str,
        *,
        wrap: bool = False,
        fill: str = "",
        quoted: bool = False,
        bold: bool = False,
    ) -> str:
        """The number of a style in the book, as it stands in a cell."""
        key = (number_format, wrap, fill, quoted, bold)
        known = self._styles.get(key)
        if known is not None:
            return known
        from openpyxl.cell import Cell
        from openpyxl.styles import Alignment, Font, PatternFill

        cell = Cell(self.workbook.worksheets[0], row=1, column=1)
        cell.number_format = number_format
        cell.alignment = Alignment(wrap_text=wrap, vertical="top")
        if fill:
            cell.fill = PatternFill("solid", fgColor=fill)
        if bold:
            cell.font = Font(name="Calibri", size=11, bold=True)
        if quoted:
            cell.quotePrefix = True  # stays text when someone edits the cell
        self._styles[key] = str(cell.style_id)
        return self._styles[key]

    def content(self) -> bytes:
        """The workbook as bytes that depend on nothing but its content: no clock enters."""
        book = self.workbook
        book.properties.created = datetime(2000, 1, 1)
        book.calculation.fullCalcOnLoad = True
        raw, result = io.BytesIO(), io.BytesIO()
        book.save(raw)
        files = {
            f"xl/worksheets/sheet{i}.xml": sheet.title
            for i, sheet in enumerate(book.worksheets, start=1)
        }
        with (
            zipfile.ZipFile(raw) as source,
            zipfile.ZipFile(result, "w", zipfile.ZIP_DEFLATED) as target,
        ):
            for item in source.infolist():
                info = zipfile.ZipInfo(item.filename, _FIXED_TIME)
                info.compress_type = zipfile.ZIP_DEFLATED
                content = source.read(item.filename)
                with target.open(info, "w") as file:
                    if files.get(item.filename) in self._rows:
                        self._fill(file.write, files[item.filename], content)
                    else:
                        file.write(_without_clock(item.filename, content))
        return result.getvalue()

    def _fill(self, write: Callable[[bytes], object], title: str, content: bytes) -> None:
        """Openpyxl's sheet with our rows in it."""
        last, columns = self._size[title]
        extent = f'<dimension ref="A1:{letter(columns - 1)}{last}"'.encode()
        content = re.sub(rb'<dimension ref="[^"]*"', extent, content)
        before, after = _ROWS.split(content, maxsplit=1)
        write(before + b"<sheetData>")
        with self._rows[title] as rows:
            rows.seek(0)
            while block := rows.read(_BLOCK):
                write(block)
        write(b"</sheetData>" + after)


def _lines_of_heading(columns: Sequence[Column[Any]]) -> int:
    return max(math.ceil(len(column.heading) / (_WIDEST_HEADING - 4)) for column in columns)


def _for_print(sheet: Any) -> None:
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.paperSize = 9  # A4
    sheet.page_setup.fitToHeight = 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    sheet.oddFooter.center.text = "&A, page &P of &N"


def _escaped(text: str) -> str:
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")


def _text(at: str, style: str, text: str) -> str:
    text = _NUMBERED.sub("_x005F_", text).replace("\r", "_x000D_")
    return (
        f'<c r="{at}" s="{style}" t="inlineStr"><is><t xml:space="preserve">{_escaped(text)}</t>'
        "</is></c>"
    )


def _formula(at: str, style: str, formula: Formula, row: int) -> str:
    text = _escaped(formula.text.removeprefix("=").replace("{r}", str(row)))
    value = formula.value
    if isinstance(value, str):
        return f'<c r="{at}" s="{style}" t="str"><f>{text}</f><v>{_escaped(clean(value))}</v></c>'
    shown = "" if value is None or not math.isfinite(value) else f"<v>{value!r}</v>"
    return f'<c r="{at}" s="{style}"><f>{text}</f>{shown}</c>'


def _without_clock(name: str, content: bytes) -> bytes:
    if name == "docProps/core.xml":
        return re.sub(rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>2000-01-01T00:00:00Z", content)
    if name == "docProps/app.xml":
        # Said truly, so that spreadsheet programs compute the formulas anew when they open it.
        return re.sub(rb"<Application>[^<]*", b"<Application>coatgui", content)
    return content
