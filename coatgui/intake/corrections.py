"""A dry run as a table to be corrected in any spreadsheet program, and read back: what a window
corrects in place, for work without one."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Callable
from dataclasses import replace

from coatgui.intake.errors import Unreadable
from coatgui.intake.lists import list_rows, row_number
from coatgui.intake.names import panel_and_hours
from coatgui.intake.proposals import Correction, DryRun, Proposal
from coatgui.intake.reading import first_guess
from coatgui.intake.units import data, kind_of, unit_of
from coatgui.records import Column, Dialect

_HEADINGS = ("file", "part", "standing", "becomes", "panel", "exposure_h", "leave_out",
             "decimal_sign", "columns", "sentences")  # fmt: skip
_YES, _NO = ("yes", "y", "x", "1", "true"), ("", "no", "n", "0", "false")
_LIKE_A_FORMULA = ("=", "+", "-", "@")
_COLUMN = re.compile(r"(\d{1,3})\s+(-?)\s*([a-z_]+)\s*(?:\[([^\[\]]*)\])?")
USUAL_UNITS = {
    "frequency": "Hz",
    "angular_frequency": "rad/s",
    "impedance": "ohm",
    "admittance": "S",
    "capacitance": "F",
    "angle": "deg",
    "time": "h",
    "temperature": "°C",
    "potential": "mV",
}


def corrected_column(
    column: Column, role: str, unit: str, turned: bool, area_cm2: float | None
) -> Column:
    """The column with what a person says of it. The unit may be per area where the panel's area is
    known. Raises ValueError, with a sentence, where the unit is none of this role."""
    sign = -1.0 if turned else 1.0
    kind = kind_of(role.removeprefix("log_"))
    if not kind:
        return replace(column, role=role, unit=unit, factor=sign)
    found = unit_of(unit or USUAL_UNITS[kind], kind)
    if found is None:
        words = role.replace("_", " ")
        raise ValueError(f"'{unit}' is no unit of the {words}: write it like {USUAL_UNITS[kind]}.")
    factor = found.factor
    if found.per_area:
        if area_cm2 is None:
            raise ValueError(
                "The unit is per area, and the panel's area is not known: add it to the panel list."
            )
        factor *= 1.0 / area_cm2 if kind == "impedance" else area_cm2
    return replace(column, role=role, unit=found.written, factor=sign * factor)


def columns_in_words(dialect: Dialect) -> str:
    """ "1 frequency [Hz]; 2 real [kOhm]; 3 -imaginary [kOhm]", columns counted from 1."""
    return "; ".join(
        f"{c.position + 1} {'-' if c.factor < 0 else ''}{c.role}{f' [{c.unit}]' if c.unit else ''}"
        for c in dialect.columns
        if c.role != "other"
    )


def corrections_table(run: DryRun, bytes_of: Callable[[str], bytes]) -> bytes:
    """The proposals as CSV in UTF-8, a row each. Where columns were not understood, what is known
    of them stands there. `bytes_of` gives the content of a file by its name."""
    held = io.StringIO(newline="")
    writer = csv.writer(held)
    writer.writerow(_HEADINGS)
    for p in run.proposals:
        dialect = _dialect(p, "", bytes_of)
        cells = (
            *(p.file, p.part, str(p.standing), p.becomes, p.panel),
            "" if p.exposure_h is None else f"{p.exposure_h:.15g}",
            "yes" if str(p.standing) == "left out" else "",
            "" if dialect is None else dialect.decimal_sign,
            "" if dialect is None else columns_in_words(dialect),
            " ".join(p.sentences),
        )
        writer.writerow([_harmless(cell) for cell in cells])
    return ("\ufeff" + held.getvalue()).encode("utf-8", errors="replace")


def read_corrections(
    content: bytes, run: DryRun, bytes_of: Callable[[str], bytes], areas_cm2: dict[str, float]
) -> dict[tuple[str, str], Correction]:
    """What such a table says that the dry run did not: panel, time, decimal sign, columns, and what
    is left out. Raises Unreadable with the line."""
    proposals = {(p.file, p.part): p for p in run.proposals}
    result: dict[tuple[str, str], Correction] = {}
    for line, row in enumerate(list_rows(content, "the corrections", "file"), start=2):
        cells = {name: _plain(cell) for name, cell in row.items()}
        key = (cells["file"], cells.get("part", ""))
        proposal = proposals.get(key)
        if proposal is None:
            raise Unreadable(f"Line {line}: there is no file '{key[0][:60]}' with that part.")
        answer = cells.get("leave_out", "").casefold()
        if answer not in (*_YES, *_NO):
            raise Unreadable(f"Line {line}: leave_out is '{answer[:20]}'; write yes or no.")
        panel, hours = cells.get("panel", ""), row_number(cells, "exposure_h", line)
        if hours is not None and hours < 0:
            raise Unreadable(f"Line {line}: exposure_h is below zero.")
        try:
            named = panel or panel_and_hours(key[0]).panel
            dialect = _corrected_dialect(cells, proposal, bytes_of, areas_cm2.get(named))
        except (ValueError, Unreadable) as problem:
            raise Unreadable(f"Line {line}: {problem}") from None
        said = Correction(
            "" if panel == proposal.panel else panel,
            None if hours is None or hours == proposal.exposure_h else hours,
            dialect,
            answer in _YES,
        )
        if said != Correction():
            result[key] = said
    return result


def _corrected_dialect(
    cells: dict[str, str],
    proposal: Proposal,
    bytes_of: Callable[[str], bytes],
    area_cm2: float | None,
) -> Dialect | None:
    """None where columns and decimal sign are as they were."""
    text, sign = cells.get("columns", ""), cells.get("decimal_sign", "")
    if sign not in ("", ".", ","):
        raise ValueError(f"decimal_sign is '{sign[:10]}'; write a point or a comma.")
    before = _dialect(proposal, "", bytes_of)
    same_sign = not sign or (before is not None and sign == before.decimal_sign)
    same_columns = not text or (before is not None and text == columns_in_words(before))
    if same_sign and same_columns:
        return None
    dialect = before if same_sign else _dialect(proposal, sign, bytes_of, anew=True)
    if dialect is None:
        raise ValueError("the file holds no table whose columns could be named.")
    if not proposal.part:
        dialect = replace(dialect, first_data_line=0)
    return dialect if same_columns else replace(dialect, columns=_columns(text, dialect, area_cm2))


def _roles() -> set[str]:
    return {"other", "log_frequency", "log_angular_frequency", "log_modulus", *data()["role"]}


def _columns(text: str, dialect: Dialect, area_cm2: float | None) -> tuple[Column, ...]:
    blank = {c.position: replace(c, role="other", unit="", factor=1.0) for c in dialect.columns}
    before = {c.position: c for c in dialect.columns}
    for part in filter(None, (piece.strip() for piece in text.split(";"))):
        found = _COLUMN.fullmatch(part)
        if not found or found[3] not in _roles():
            raise ValueError(
                f"'{part[:40]}' is no column: write it like '2 real [kOhm]' or '3 -imaginary'."
            )
        place, turned, unit = int(found[1]) - 1, bool(found[2]), (found[4] or "").strip()
        if place not in blank:
            raise ValueError(f"there is no column {place + 1}: the table has {len(blank)}.")
        own = before[place]
        as_it_was = (own.role, own.unit, own.factor < 0) == (found[3], unit, turned)
        blank[place] = own if as_it_was else corrected_column(own, found[3], unit, turned, area_cm2)
    return tuple(blank.values())


def _dialect(
    proposal: Proposal, sign: str, bytes_of: Callable[[str], bytes], *, anew: bool = False
) -> Dialect | None:
    """How a file was read, or would be cut."""
    if proposal.dialect is not None and not anew:
        return proposal.dialect
    if not proposal.may_be_read:
        return None
    try:
        return first_guess(bytes_of(proposal.file), sign)
    except (Unreadable, OSError):
        return None


def _harmless(text: str) -> str:
    """A spreadsheet program takes no text for a formula that stands behind an apostrophe."""
    return f"'{text}" if text.startswith(_LIKE_A_FORMULA) else text


def _plain(text: str) -> str:
    return text[1:] if text[:1] == "'" and text[1:].startswith(_LIKE_A_FORMULA) else text
