"""The panel list and the readings list of a folder."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from dataclasses import dataclass

from coatgui.intake.decode import decode
from coatgui.intake.errors import Unreadable
from coatgui.intake.numbers import Style, number
from coatgui.records import FoundPanel

_PANEL_WORDS = ("formulation", "substrate", "electrolyte", "regime", "remark")
_PANEL_NUMBERS = ("area_cm2", "thickness_um", "temperature_c")
_READING_NUMBERS = ("exposure_h", "temperature_c", "amplitude_mv", "potential_mv")


@dataclass(frozen=True, slots=True)
class ListedReading:
    """A row of the readings list. `part` names one spectrum of a file of several, "" for all."""

    file: str
    part: str
    panel: str
    exposure_h: float | None
    temperature_c: float | None
    amplitude_mv: float | None
    potential_mv: float | None
    remark: str


def list_rows(data: bytes, name: str, wanted: str) -> list[dict[str, str]]:
    """Rows of a list by heading. Raises Unreadable where the column `wanted` is missing."""
    text, _ = decode(data)
    lines = [line for line in text.splitlines() if line.strip()]
    if not lines:
        raise Unreadable("The list is empty.")
    delimiter = max(";,\t", key=lines[0].count)
    rows = list(csv.reader(lines, delimiter=delimiter))
    headings = [cell.strip().casefold() for cell in rows[0]]
    if wanted not in headings:
        raise Unreadable(f"The list has no column '{wanted}': add it to the first line of {name}.")
    result = []
    for line, row in enumerate(rows[1:], start=2):
        if len(row) > len(headings):
            raise Unreadable(
                f"Line {line} has {len(row)} cells where the heading has {len(headings)}: put "
                "text that holds the delimiter between quotation marks."
            )
        cells = [cell.strip() for cell in row] + [""] * (len(headings) - len(row))
        result.append(dict(zip(headings, cells, strict=True)))
    return result


def row_number(
    row: dict[str, str], name: str, line: int, *, positive: bool = False
) -> float | None:
    """A number of a row, either decimal sign; None for an empty cell. Raises Unreadable."""
    text = row.get(name, "")
    if not text:
        return None
    for sign in (".", ","):
        value = number(text, Style(sign))
        if value is not None:
            if positive and not value > 0:
                raise Unreadable(f"Line {line}: {name} is {text}; it must be above zero.")
            return value
    raise Unreadable(f"Line {line}: {name} is '{text[:40]}', which is not a number.")


def read_panels(data: bytes, name: str) -> tuple[FoundPanel, ...]:
    """The rows of a panel list. Raises Unreadable with the line."""
    return panels_of(list_rows(data, name, "panel"))


def read_readings(data: bytes, name: str) -> dict[tuple[str, str], ListedReading]:
    """The rows of a readings list by file and part. Raises Unreadable with the line."""
    return readings_of(list_rows(data, name, "file"))


def panels_of(rows: Iterable[dict[str, str]]) -> tuple[FoundPanel, ...]:
    """Panels from rows by heading; the headings stand in line 1."""
    known = {"panel", *_PANEL_WORDS, *_PANEL_NUMBERS}
    panels: dict[str, FoundPanel] = {}
    for line, row in enumerate(rows, start=2):
        if not row["panel"]:
            raise Unreadable(f"Line {line} names no panel.")
        if row["panel"] in panels:
            raise Unreadable(f"Line {line}: panel {row['panel']} is listed twice.")
        panels[row["panel"]] = FoundPanel(
            panel=row["panel"],
            formulation=row.get("formulation", ""),
            area_cm2=row_number(row, "area_cm2", line, positive=True),
            thickness_um=row_number(row, "thickness_um", line, positive=True),
            substrate=row.get("substrate", ""),
            electrolyte=row.get("electrolyte", ""),
            temperature_c=row_number(row, "temperature_c", line),
            regime=row.get("regime", ""),
            remark=row.get("remark", ""),
            notes=tuple((k, v) for k, v in row.items() if k not in known and v),
        )
    return tuple(panels.values())


def readings_of(rows: Iterable[dict[str, str]]) -> dict[tuple[str, str], ListedReading]:
    """Readings by file and part from rows by heading; the headings stand in line 1."""
    listed: dict[tuple[str, str], ListedReading] = {}
    for line, row in enumerate(rows, start=2):
        file = row["file"].replace("\\", "/")
        if not file:
            raise Unreadable(f"Line {line} names no file.")
        numbers = {field: row_number(row, field, line) for field in _READING_NUMBERS}
        if (numbers["exposure_h"] or 0.0) < 0:
            raise Unreadable(f"Line {line}: exposure_h is below zero.")
        part = row.get("part", "")
        listed[file, part] = ListedReading(
            file=file,
            part=part,
            panel=row.get("panel", ""),
            remark=row.get("remark", ""),
            **numbers,
        )
    return listed
