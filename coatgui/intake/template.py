"""A workbook for the panel list, the readings list and visual ratings, written by the program for
people to fill in, and read back."""

from __future__ import annotations

import io
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import Any

from coatgui.intake.errors import Unreadable
from coatgui.intake.lists import ListedReading, panels_of, readings_of
from coatgui.intake.ratings_list import ratings_of, scale_ids
from coatgui.intake.segments import Cell
from coatgui.intake.workbook import Sheet, read_workbook
from coatgui.records import FoundPanel, FoundRating

PANELS, READINGS, RATINGS = "Panels", "Readings", "Ratings"
_HEADINGS = {
    PANELS: ("panel", "formulation", "area_cm2", "thickness_um", "substrate", "electrolyte",
             "temperature_c", "regime", "start", "remark"),
    READINGS: ("file", "part", "panel", "exposure_h", "temperature_c", "amplitude_mv",
               "potential_mv", "remark"),
    RATINGS: ("panel", "exposure_h", "scale", "rating", "edition", "rater", "remark"),
}  # fmt: skip
_KEY = {PANELS: "panel", READINGS: "file", RATINGS: "panel"}
_WIDTH = 18


@dataclass(frozen=True)
class Lists:
    """What a filled-in workbook says."""

    panels: tuple[FoundPanel, ...] = ()
    readings: dict[tuple[str, str], ListedReading] = field(default_factory=dict)
    ratings: tuple[FoundRating, ...] = ()


def template(panels: Iterable[FoundPanel] = (), files: Iterable[str] = ()) -> bytes:
    """The bytes of a workbook with the three sheets; panels and files that are known already stand
    in it."""
    import openpyxl
    from openpyxl.worksheet.datavalidation import DataValidation

    book = openpyxl.Workbook()
    first = book.active
    if first is not None:
        book.remove(first)
    rows: dict[str, list[list[Any]]] = {
        PANELS: [[getattr(p, h, dict(p.notes).get(h)) for h in _HEADINGS[PANELS]] for p in panels],
        READINGS: [[file] for file in files],
        RATINGS: [],
    }
    for title, headings in _HEADINGS.items():
        sheet = book.create_sheet(title)
        for r, row in enumerate([list(headings), *rows[title]], start=1):
            for c, value in enumerate(row, start=1):
                if value is None or value == "":
                    continue
                cell = sheet.cell(r, c)
                if isinstance(value, str):
                    # A text that begins with "=" must not become a formula.
                    cell.value = "".join(ch for ch in value if ch.isprintable())
                    cell.data_type = "s"
                else:
                    cell.value = value
        sheet.freeze_panes = "A2"
        for letter in "ABCDEFGHIJ"[: len(headings)]:
            sheet.column_dimensions[letter].width = _WIDTH
    scales = DataValidation("list", formula1=f'"{",".join(scale_ids())}"', allow_blank=True)
    scales.add("C2:C1000")
    book[RATINGS].add_data_validation(scales)
    buffer = io.BytesIO()
    book.save(buffer)
    return buffer.getvalue()


def read_lists(data: bytes, name: str = "") -> Lists | None:
    """What a workbook with a sheet "Panels", "Readings" or "Ratings" says; None where it has none.
    Raises Unreadable with the sheet and line where something is wrong. `name` is the file's."""
    sheets = {sheet.title: sheet for sheet in read_workbook(data)}
    rows = {}
    for title in _HEADINGS:
        if title in sheets and (found := _rows(sheets[title], _KEY[title])) is not None:
            rows[title] = found
    if not rows:
        return None
    doing = PANELS
    try:
        panels = panels_of(rows.get(PANELS, ()))
        doing = READINGS
        readings = readings_of(rows.get(READINGS, ()))
        doing = RATINGS
        ratings = ratings_of(rows.get(RATINGS, ()), name)
    except Unreadable as problem:
        raise Unreadable(f"Sheet '{doing}': {problem}") from None
    return Lists(panels, readings, ratings)


def _rows(sheet: Sheet, key: str) -> list[dict[str, str]] | None:
    """Rows by heading, from the sheet's first row on; None where its key is not among them."""
    if not sheet.rows:
        return None
    first, cells = sheet.rows[0]
    headings = [_text(cell).casefold() for cell in cells]
    if key not in headings or first != 1:
        return None
    if [number for number, _ in sheet.rows] != list(range(1, len(sheet.rows) + 1)):
        raise Unreadable(f"Sheet '{sheet.title}' has empty rows between others: remove them.")
    return [_by_heading(headings, row) for _, row in sheet.rows[1:]]


def _by_heading(headings: Sequence[str], row: Sequence[Cell]) -> dict[str, str]:
    cells = [_text(cell) for cell in row]
    cells += [""] * (len(headings) - len(cells))
    return {h: cell for h, cell in zip(headings, cells, strict=False) if h}


def _text(cell: Cell) -> str:
    return f"{cell:.15g}" if isinstance(cell, float) else cell.strip()
