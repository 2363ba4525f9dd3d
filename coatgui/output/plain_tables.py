"""The assessment as CSV tables, with a description of every column that programs can read.

UTF-8, comma, full stop, CRLF (RFC 4180); a missing number is an empty cell; numbers are written so
that exactly the same number is read back. `tables.json` beside them names every file, column, unit
and meaning. Text that a spreadsheet would take for a formula stands behind an apostrophe; the
description says so.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from operator import attrgetter
from pathlib import Path
from typing import Any

from coatgui import __version__
from coatgui.output.text import printable
from coatgui.output.whole import write_whole
from coatgui.records import Assessment, Campaign, Quantity

DESCRIPTION = "tables.json"
SCHEMA = "coatgui-tables/1"
_LIKE_A_FORMULA = ("=", "+", "-", "@")


@dataclass(frozen=True, slots=True)
class _Column:
    """`kind` is text, number or truth; `unit` is empty for what has none."""

    name: str
    kind: str
    unit: str
    meaning: str
    value: Callable[[Any], Any]


@dataclass(frozen=True, slots=True)
class _Table:
    name: str
    meaning: str
    columns: Sequence[_Column]
    rows: Iterable[Any]


def _text(name: str, meaning: str, value: Callable[[Any], Any]) -> _Column:
    return _Column(name, "text", "", meaning, value)


def _number(name: str, unit: str, meaning: str, value: Callable[[Any], Any]) -> _Column:
    return _Column(name, "number", unit, meaning, value)


def _quantity(name: str, meaning: str, of: Callable[[Any], Quantity | None]) -> list[_Column]:
    """Value, limits, kind of bound and unit: the unit differs where a panel has no area."""

    def part(which: str) -> Callable[[Any], Any]:
        return lambda row: getattr(of(row), which, None)

    unit = f"see {name}_unit"
    return [
        _number(name, unit, meaning, part("value")),
        _number(f"{name}_low", unit, f"{meaning}, lower 95 % limit", part("low")),
        _number(f"{name}_high", unit, f"{meaning}, upper 95 % limit", part("high")),
        _text(
            f"{name}_bound",
            "two_sided, at_least, at_most, fixed or undetermined; empty where there is no value",
            part("bound"),
        ),
        _text(f"{name}_unit", "unit of the value and its limits", part("unit")),
    ]


def _who(of: Callable[[Any], Any]) -> list[_Column]:
    return [
        _text("formulation", "name of the formulation", lambda row: of(row).formulation),
        _text("panel", "name of the panel", lambda row: of(row).panel),
        _number("exposure_h", "h", "exposure time", lambda row: of(row).exposure_h),
    ]


def _first(row: Any) -> Any:
    return row[0]


def _tables(assessment: Assessment, campaign: Campaign) -> list[_Table]:
    readings, panels = assessment.readings, assessment.panels
    return [
        _Table(
            "panels",
            "One row a panel.",
            [
                _text("formulation", "name of the formulation", attrgetter("formulation")),
                _text("panel", "name of the panel", attrgetter("panel")),
                _number("area_cm2", "cm²", "exposed area", attrgetter("area_cm2")),
                _number("thickness_um", "µm", "film thickness", attrgetter("thickness_um")),
                *_quantity(
                    "dry_capacitance", "capacitance of the dry film", attrgetter("dry_capacitance")
                ),
                *_quantity(
                    "diffusion_coefficient",
                    "diffusion coefficient of water in the film",
                    attrgetter("diffusion_coefficient"),
                ),
                *_quantity(
                    "dry_permittivity",
                    "effective relative permittivity of the dry film",
                    attrgetter("dry_permittivity"),
                ),
                *_quantity(
                    "saturation_uptake",
                    "apparent water at saturation by Brasher–Kingsbury",
                    lambda p: p.saturation_uptake.quantity if p.saturation_uptake else None,
                ),
                *_quantity(
                    "saturation_mass",
                    "water at saturation by mass",
                    attrgetter("saturation_mass_percent"),
                ),
                _text("events", "what happened", lambda p: " ".join(e.text for e in p.events)),
                _text(
                    "limits",
                    "standing against the limits",
                    lambda p: " ".join(c.text for c in p.limit_crossings),
                ),
            ],
            panels,
        ),
        _Table(
            "readings",
            "One row a reading: a spectrum of a panel at an exposure time.",
            [
                *_who(lambda r: r),
                _text("file", "file it came from", attrgetter("file")),
                _text("sha256", "SHA-256 of that file", attrgetter("sha256")),
                _Column(
                    "counts", "truth", "", "false where rejected", lambda r: str(r.counts).lower()
                ),
                _number("points_read", "", "points in the spectrum", attrgetter("points_read")),
                _number("points_used", "", "points evaluated", attrgetter("points_used")),
                _text("model", "coating model", lambda r: r.fit.model if r.fit else None),
                _number(
                    "residual_rms_percent",
                    "%",
                    "root mean square of the fit's residuals",
                    lambda r: r.fit.residual_rms_percent if r.fit else None,
                ),
                *_quantity(
                    "coating_capacitance", "film capacitance", attrgetter("coating_capacitance")
                ),
                *_quantity("pore_resistance", "pore resistance", attrgetter("pore_resistance")),
                *_quantity(
                    "water_uptake",
                    "apparent water uptake by Brasher–Kingsbury",
                    lambda r: r.water_uptake.quantity if r.water_uptake else None,
                ),
                *_quantity(
                    "relative_permittivity",
                    "effective relative permittivity of the film",
                    attrgetter("relative_permittivity"),
                ),
                *_quantity(
                    "film_resistivity",
                    "effective resistivity of the film",
                    attrgetter("film_resistivity"),
                ),
                _number(
                    "active_area_low",
                    "",
                    "least active share of the area by any route",
                    lambda r: r.active_area.low if r.active_area else None,
                ),
                _number(
                    "active_area_high",
                    "",
                    "largest active share of the area by any route",
                    lambda r: r.active_area.high if r.active_area else None,
                ),
            ],
            readings,
        ),
        _Table(
            "moduli",
            "One row for each reading and wanted frequency.",
            [
                *_who(_first),
                _number("frequency_hz", "Hz", "frequency", lambda row: row[1].frequency_hz),
                _text("status", "measured, interpolated or not_reached", lambda row: row[1].status),
                *_quantity("modulus", "|Z|, times the area", lambda row: row[1].quantity),
            ],
            [(r, m) for r in readings for m in r.modulus],
        ),
        _Table(
            "parameters",
            "One row for each fitted parameter of a reading.",
            [
                *_who(_first),
                _text("symbol", "the trade's symbol", lambda row: row[1].symbol),
                _text("meaning", "in words", lambda row: row[1].meaning),
                _number("layer", "", "0 the solution, 1 the outermost layer", lambda r: r[1].layer),
                *_quantity("value", "fitted value", lambda row: row[1].quantity),
            ],
            [(r, p) for r in readings for p in r.parameters],
        ),
        _Table(
            "courses",
            "One row for each formulation, quantity and inspection: the mean of the panels.",
            [
                _text("formulation", "name", lambda row: row[0].formulation),
                _text("quantity", "code of the quantity", lambda row: row[1].code),
                _number("exposure_h", "h", "exposure time", lambda row: row[2].exposure_h),
                *_quantity("mean", "mean of the panels", lambda row: row[2].quantity),
                _number("panels", "", "panels in the mean", lambda row: row[2].panels),
                _number("censored", "", "of these only bounds", lambda row: row[2].censored),
                _number("doubtful", "", "of these under doubt", lambda row: row[2].doubtful),
                *_quantity("sound", "mean without those under doubt", lambda row: row[2].sound),
            ],
            [(f, c, p) for f in assessment.formulations for c in f.courses for p in c.points],
        ),
        _Table(
            "findings",
            "One row a finding; panel and exposure are empty where it is about the campaign.",
            [
                _text("panel", "name of the panel", lambda row: row[0]),
                _number("exposure_h", "h", "exposure time", lambda row: row[1]),
                _text("severity", "note, doubt or reject", lambda row: row[2].severity),
                _text("code", "stable name of the finding", lambda row: row[2].code),
                _text("text", "in words", lambda row: row[2].text),
            ],
            [
                *(("", None, f) for f in assessment.findings),
                *((p.panel, None, f) for p in panels for f in p.findings),
                *((r.panel, r.exposure_h, f) for r in readings for f in r.findings),
            ],
        ),
        _Table(
            "points_left_out",
            "One row a point that was not evaluated.",
            [
                *_who(_first),
                _number("frequency_hz", "Hz", "frequency", lambda row: row[1].frequency_hz),
                _text("reason", "why", lambda row: row[1].reason),
            ],
            [(r, point) for r in readings for point in r.left_out],
        ),
    ]


def write_tables(assessment: Assessment, campaign: Campaign, folder: Path) -> list[Path]:
    """Write the tables and their description into `folder`, made if need be. Each file is written
    whole or not at all, the description last. Raises OSError."""
    folder.mkdir(exist_ok=True)
    tables = _tables(assessment, campaign)
    contents = {f"{table.name}.csv": _csv(table) for table in tables}
    contents[DESCRIPTION] = _description(tables)
    for name, content in contents.items():
        write_whole(folder / name, lambda file, content=content: file.write(content))  # type: ignore[misc]
    return [folder / name for name in contents]


def _csv(table: _Table) -> bytes:
    text = io.StringIO(newline="")
    writer = csv.writer(text)
    writer.writerow([column.name for column in table.columns])
    for row in table.rows:
        writer.writerow([_cell(column, column.value(row)) for column in table.columns])
    return text.getvalue().encode("utf-8")


def _cell(column: _Column, value: Any) -> str:
    if value is None:
        return ""
    if column.kind == "number":
        return repr(value) if math.isfinite(value) else ""
    text = printable(str(value))
    return f"'{text}" if text.startswith(_LIKE_A_FORMULA) else text


def _description(tables: Sequence[_Table]) -> bytes:
    data = {
        "schema": SCHEMA,
        "program": f"coatgui {__version__}",
        "encoding": "utf-8",
        "delimiter": ",",
        "decimal_sign": ".",
        "missing": "",
        "text_note": "A text that begins with = + - or @ stands behind an apostrophe, so that no "
        "spreadsheet takes it for a formula.",
        "tables": [
            {
                "file": f"{table.name}.csv",
                "meaning": table.meaning,
                "columns": [
                    {"name": c.name, "kind": c.kind, "unit": c.unit, "meaning": c.meaning}
                    for c in table.columns
                ],
            }
            for table in tables
        ],
    }
    return (json.dumps(data, ensure_ascii=False, indent=1) + "\n").encode("utf-8")
